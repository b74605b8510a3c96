// Carries the tests' precompiled header; see CMakeLists.txt.
