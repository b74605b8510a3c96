// A file that is written beside its final name and takes it only when complete: FILE.partial-PID, renamed by `finish`.
// What cannot be written is found when it is opened, before any work is done. A target that is there and is no regular
// file (a pipe, a terminal) is written straight away.
#pragma once

#include <cstdio>
#include <string>
#include <string_view>

namespace slipbench {

class OutFile {
 public:
  explicit OutFile(std::string path);  // throws OutsideError
  ~OutFile();                          // unfinished: removes what it wrote
  OutFile(const OutFile&) = delete;
  OutFile& operator=(const OutFile&) = delete;

  void write(std::string_view text);  // never throws: a failure is kept for `finish`
  [[nodiscard]] bool failed() const { return error_ != 0; }
  void finish();  // throws OutsideError when any byte did not reach the file
  [[nodiscard]] const std::string& path() const { return path_; }
  // Where the bytes go until then; `path` itself where that is a pipe or a device.
  [[nodiscard]] const std::string& working_path() const { return working_path_; }

 private:
  std::string path_, working_path_;
  std::FILE* file_ = nullptr;
  int error_ = 0;  // first errno met
};

}  // namespace slipbench
