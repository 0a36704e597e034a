# Generates the parser from the grammar and builds it as a library of its own.
#
# The generated code is C++17 (its u8"" literals are no char strings in C++20) and not ours to warn about. Whoever
# needs it links `grammar` and finds "OpenQasm3Parser.h" and the runtime's "antlr4-runtime.h" as system headers.
find_program(ANTLR4 antlr4 REQUIRED)
find_package(antlr4-runtime REQUIRED)

set(generated ${CMAKE_BINARY_DIR}/generated/grammar)
set(runtime_headers ${ANTLR4_INCLUDE_DIR})

# clang refuses the default constructor of the runtime's Vocabulary, whose const vectors have no initializer: it
# gets a copy of the headers in which they have one.
if(CMAKE_CXX_COMPILER_ID MATCHES "Clang")
  set(runtime_headers ${CMAKE_BINARY_DIR}/generated/antlr4-runtime)
  file(COPY ${ANTLR4_INCLUDE_DIR}/ DESTINATION ${runtime_headers})
  file(READ ${runtime_headers}/Vocabulary.h vocabulary)
  string(REGEX REPLACE "(std::vector<std::string> const _[A-Za-z]+);" "\\1{};" vocabulary "${vocabulary}")
  file(WRITE ${runtime_headers}/Vocabulary.h "${vocabulary}")
endif()

# generate(GRAMMAR NEEDS...): GRAMMAR.h and GRAMMAR.cpp from grammar/GRAMMAR.g4.
function(generate grammar)
  add_custom_command(
    OUTPUT ${generated}/${grammar}.cpp ${generated}/${grammar}.h ${generated}/${grammar}.tokens
    COMMAND ${ANTLR4} -Dlanguage=Cpp -encoding UTF-8 -Xexact-output-dir -no-visitor -no-listener -package isinglass
            -lib ${generated} -o ${generated} ${CMAKE_CURRENT_SOURCE_DIR}/grammar/${grammar}.g4
    DEPENDS ${CMAKE_CURRENT_SOURCE_DIR}/grammar/${grammar}.g4 ${ARGN}
    VERBATIM)
endfunction()

file(MAKE_DIRECTORY ${generated})
generate(OpenQasm3Lexer)
generate(OpenQasm3Parser ${generated}/OpenQasm3Lexer.tokens)

add_library(grammar STATIC ${generated}/OpenQasm3Lexer.cpp ${generated}/OpenQasm3Parser.cpp)
set_target_properties(grammar PROPERTIES CXX_STANDARD 17)
target_compile_options(grammar PRIVATE -w)
target_include_directories(grammar SYSTEM PUBLIC ${generated} ${runtime_headers})
target_link_libraries(grammar PUBLIC antlr4_static Threads::Threads)
