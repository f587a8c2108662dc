# SPDX-License-Identifier: Apache-2.0
# Writes the style sheets and scripts of the pages as C++ text, so that the program carries them:
#   cmake -DFOLDER=engine/report -DOUT=page_files.cpp -P embed.cmake
file(GLOB files ${FOLDER}/*.css ${FOLDER}/*.js)
list(SORT files)
set(text "// Written by embed.cmake.\n#include \"engine/report/page_files.hpp\"\n\n")
string(APPEND text "namespace rille::engine {\n\nconst std::vector<PageFile>& page_files() {\n")
string(APPEND text "    static const std::vector<PageFile> files = {\n")
foreach(file IN LISTS files)
  get_filename_component(name "${file}" NAME)
  file(READ "${file}" content)
  string(APPEND text "{\"${name}\", R\"page_file(${content})page_file\"},\n")
endforeach()
string(APPEND text "    };\n    return files;\n}\n\n} // namespace rille::engine\n")
file(WRITE "${OUT}" "${text}")
