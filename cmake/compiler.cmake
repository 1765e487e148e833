# C++20 for the baseline x86-64; kernels for newer processors are separate files chosen at run time.
set(CMAKE_CXX_STANDARD 20)
set(CMAKE_CXX_STANDARD_REQUIRED ON)
set(CMAKE_CXX_EXTENSIONS OFF)
set(CMAKE_EXPORT_COMPILE_COMMANDS ON)

# RelWithDebInfo usually brings -DNDEBUG; our asserts guard against programming mistakes and stay.
set(CMAKE_CXX_FLAGS_RELWITHDEBINFO "-O2 -g1")

# Reproducible digits: no fused multiply-add behind our back. Reproducible objects: no absolute paths.
add_compile_options(-ffp-contract=off -ffile-prefix-map=${PROJECT_SOURCE_DIR}=.)

if(COILASSAY_FUZZ)
  # What is looked for ends the process, so that the input is kept.
  add_compile_options(-O1 -fno-omit-frame-pointer -fsanitize=fuzzer-no-link,address,undefined -fno-sanitize=vptr
                      -fno-sanitize-recover=undefined)
  add_link_options(-fsanitize=address,undefined -fno-sanitize=vptr)
  add_compile_definitions(_GLIBCXX_ASSERTIONS COILASSAY_READ_BLOCK=4096)
elseif(COILASSAY_SANITIZE STREQUAL "thread")
  add_compile_options(-O1 -fno-omit-frame-pointer -fsanitize=thread)
  add_link_options(-fsanitize=thread)
elseif(COILASSAY_SANITIZE)
  # vptr needs type information that some Debian libraries do not export.
  add_compile_options(-O1 -fno-omit-frame-pointer -fsanitize=address,undefined -fno-sanitize=vptr
                      -fno-sanitize-recover=undefined)
  add_link_options(-fsanitize=address,undefined -fno-sanitize=vptr)
  add_compile_definitions(_GLIBCXX_ASSERTIONS)
endif()

add_library(coilassay_warnings INTERFACE)
if(CMAKE_CXX_COMPILER_ID STREQUAL "GNU")
  target_compile_options(coilassay_warnings INTERFACE
    -Wall -Wextra -Wpedantic -Wconversion -Wsign-conversion -Wshadow -Wnon-virtual-dtor -Woverloaded-virtual
    -Wold-style-cast -Wcast-qual -Wformat=2 -Wnull-dereference -Wduplicated-cond -Wlogical-op -Wuseless-cast -Werror)
endif()

# A fresh clone in another folder hits the cache: paths are taken relative to the source folder.
find_program(COILASSAY_CCACHE ccache)
if(COILASSAY_CCACHE AND NOT CMAKE_CXX_COMPILER_LAUNCHER)
  set(CMAKE_CXX_COMPILER_LAUNCHER ${CMAKE_COMMAND} -E env CCACHE_BASEDIR=${PROJECT_SOURCE_DIR} CCACHE_NOHASHDIR=1
      ${COILASSAY_CCACHE})
endif()
