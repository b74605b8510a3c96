# Text files as a C++ source: cmake -DOUT=files.cpp -DFOLDER=dir -DNAMES="a.c,b.h" -DHEADER=x.hpp -DLIST=list_name -P embed.cmake
# LIST is a function that HEADER declares: std::span<const EmbeddedFile> LIST().
string(REPLACE "," ";" names "${NAMES}")
set(all "// Written by cmake/embed.cmake.\n#include \"${HEADER}\"\n\nnamespace slipbench {\n\nstd::span<const EmbeddedFile> ${LIST}() {\n  static constexpr EmbeddedFile files[] = {\n")
file(WRITE ${OUT}.new "${all}")
foreach(name ${names})
  file(READ ${FOLDER}/${name} text)
  file(APPEND ${OUT}.new "      {\"${name}\", R\"~~~~(")
  file(APPEND ${OUT}.new "${text}")
  file(APPEND ${OUT}.new ")~~~~\"},\n")
endforeach()
file(APPEND ${OUT}.new "  };\n  return files;\n}\n\n}  // namespace slipbench\n")
file(RENAME ${OUT}.new ${OUT})
