# embed.cmake: cmake -DINPUT=FILE -DOUTPUT=FILE.c -DNAME=identifier -P embed.cmake writes the bytes of
# a file as a C array that ends with a NUL.
file(READ ${INPUT} bytes HEX)
string(REGEX REPLACE "([0-9a-f][0-9a-f])" "0x\\1," bytes "${bytes}")
get_filename_component(file ${OUTPUT} NAME)
get_filename_component(source ${INPUT} NAME)
file(WRITE ${OUTPUT} "/* ${file}: made from ${source}. */
#include \"report/web.h\"

const char ${NAME}[] = {${bytes} 0};
")
