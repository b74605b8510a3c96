// SHA-256 against the standard's examples and against another program.
#include <catch2/catch.hpp>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <string>

#include "sim/record/sha256.hpp"

using namespace slipbench;

namespace {

std::span<const std::uint8_t> bytes(const std::string& text) {
  return {reinterpret_cast<const std::uint8_t*>(text.data()), text.size()};
}
std::string digest(const std::string& text) {
  Sha256 sha;
  sha.add(bytes(text));
  return sha.hex();
}

}  // namespace

TEST_CASE("sha256: the standard's examples", "[record][published]") {
  // NIST FIPS 180-2, appendix B (the examples to FIPS 180-4), and the empty message of NIST's validation set.
  CHECK(digest("") == "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
  CHECK(digest("abc") == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  CHECK(digest("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq") ==
        "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
  CHECK(digest(std::string(1000000, 'a')) == "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
}

TEST_CASE("sha256: the pieces in which bytes arrive do not matter", "[record][property]") {
  std::string text;
  for (int i = 0; i < 1000; ++i) text += static_cast<char>(i * 37 % 251);
  for (const std::size_t piece : {1u, 7u, 63u, 64u, 65u, 200u}) {
    Sha256 sha;
    for (std::size_t at = 0; at < text.size(); at += piece)
      sha.add(bytes(text).subspan(at, std::min(piece, text.size() - at)));
    CHECK(sha.hex() == digest(text));
  }
}

TEST_CASE("sha256: every length around a block agrees with sha256sum", "[record][published]") {
  // GNU coreutils' sha256sum: an implementation that this one was not written from.
  if (std::system("sha256sum --version > /dev/null 2>&1") != 0) {
    WARN("sha256sum is not installed");
    return;
  }
  const auto path = std::filesystem::temp_directory_path() / "slipbench-test-sha256";
  for (const int length : {1, 54, 55, 56, 57, 63, 64, 65, 119, 120, 128, 1000}) {
    std::string text;
    for (int i = 0; i < length; ++i) text += static_cast<char>(i * 91 + length);
    std::FILE* file = std::fopen(path.c_str(), "wb");
    REQUIRE(file != nullptr);
    std::fwrite(text.data(), 1, text.size(), file);
    std::fclose(file);
    std::FILE* pipe = ::popen(("sha256sum < " + path.string()).c_str(), "r");
    REQUIRE(pipe != nullptr);
    char answer[65] = {};
    REQUIRE(std::fread(answer, 1, 64, pipe) == 64);
    ::pclose(pipe);
    CHECK(digest(text) == answer);
  }
  std::filesystem::remove(path);
}
