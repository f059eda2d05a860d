# cmake -DOUT=... -DNAMES=a|b -DFILES=x|y -P embed.cmake: texts as C++ constants.
set(text "// Made at build from apps/page; do not edit.\n#include \"page_parts.hpp\"\n\nnamespace rillstrand::page {\n")
string(REPLACE "|" ";" NAMES "${NAMES}")
string(REPLACE "|" ";" FILES "${FILES}")
foreach(name file IN ZIP_LISTS NAMES FILES)
    file(READ ${file} hex HEX)
    string(REGEX REPLACE "([0-9a-f][0-9a-f])" "0x\\1," bytes "${hex}")
    string(APPEND text "static const unsigned char ${name}_bytes[] = {${bytes}0};\n"
                       "const char* const ${name} = reinterpret_cast<const char*>(${name}_bytes);\n")
endforeach()
string(APPEND text "} // namespace rillstrand::page\n")
file(WRITE ${OUT} "${text}")
