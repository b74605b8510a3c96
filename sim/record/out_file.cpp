#include "sim/record/out_file.hpp"

#include <unistd.h>

#include <cerrno>
#include <cstring>
#include <filesystem>

#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace fs = std::filesystem;

namespace {

[[noreturn]] void refuse(const std::string& path, int error) {
  throw OutsideError("cannot write '" + path + "': " + std::strerror(error));
}

}  // namespace

OutFile::OutFile(std::string path) : path_(std::move(path)), working_path_(path_) {
  if (path_.empty()) refuse(path_, ENOENT);
  std::error_code ignored;
  const fs::file_status status = fs::status(path_, ignored);
  if (fs::is_directory(status)) refuse(path_, EISDIR);
  const bool there = fs::exists(status);
  if (there && ::access(path_.c_str(), W_OK) != 0) refuse(path_, errno);
  if (!there || fs::is_regular_file(status)) working_path_ += ".partial-" + std::to_string(::getpid());
  file_ = std::fopen(working_path_.c_str(), "wb");
  if (file_ == nullptr) refuse(path_, errno);
}

OutFile::~OutFile() {
  if (file_ == nullptr) return;
  std::fclose(file_);
  if (working_path_ != path_) std::remove(working_path_.c_str());
}

void OutFile::write(std::string_view text) {
  if (error_ != 0 || file_ == nullptr || text.empty()) return;
  if (std::fwrite(text.data(), 1, text.size(), file_) != text.size()) error_ = errno != 0 ? errno : EIO;
}

void OutFile::finish() {
  if (file_ == nullptr) return;
  if (std::fclose(file_) != 0 && error_ == 0) error_ = errno != 0 ? errno : EIO;
  file_ = nullptr;
  if (error_ == 0 && working_path_ != path_ && std::rename(working_path_.c_str(), path_.c_str()) != 0) error_ = errno;
  if (error_ == 0) return;
  if (working_path_ != path_) std::remove(working_path_.c_str());
  refuse(path_, error_);
}

}  // namespace slipbench
