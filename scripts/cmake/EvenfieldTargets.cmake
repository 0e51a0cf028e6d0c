include(GNUInstallDirs)
include(CheckCXXCompilerFlag)
find_package(PkgConfig REQUIRED)
pkg_check_modules(TIFF REQUIRED IMPORTED_TARGET GLOBAL libtiff-4)
pkg_check_modules(CFITSIO REQUIRED IMPORTED_TARGET GLOBAL cfitsio)
pkg_check_modules(ZLIB REQUIRED IMPORTED_TARGET GLOBAL zlib)
find_package(Threads REQUIRED)
find_package(Eigen3 3.3 REQUIRED NO_MODULE)
find_package(Boost 1.74 REQUIRED)
find_package(nlohmann_json 3.11 REQUIRED)
# Debian's small OpenCV packages come without CMake or pkg-config files of their own.
find_path(EVENFIELD_OPENCV_HEADERS opencv2/core.hpp PATH_SUFFIXES opencv4 REQUIRED)
find_library(EVENFIELD_OPENCV_CORE opencv_core REQUIRED)
add_library(evenfield_opencv_core INTERFACE IMPORTED GLOBAL)
target_link_libraries(evenfield_opencv_core INTERFACE ${EVENFIELD_OPENCV_CORE})
target_include_directories(evenfield_opencv_core SYSTEM INTERFACE ${EVENFIELD_OPENCV_HEADERS})

# A compiler cache shortens rebuilds; it is used where it is present and nobody chose a launcher.
if(EVENFIELD_DEVELOPER AND NOT DEFINED CMAKE_CXX_COMPILER_LAUNCHER)
  find_program(EVENFIELD_CCACHE ccache)
  if(EVENFIELD_CCACHE)
    set(CMAKE_CXX_COMPILER_LAUNCHER ${EVENFIELD_CCACHE})
  endif()
endif()

# Warnings are policy of this project, kept off the targets of whoever builds it as a part of another.
function(evenfield_compile_rules target)
  target_compile_features(${target} PUBLIC cxx_std_20)
  # No fused multiply-add: it would let results differ from machine to machine.
  target_compile_options(${target} PRIVATE -ffp-contract=off)
  if(EVENFIELD_DEVELOPER)
    target_compile_options(${target} PRIVATE -Wall -Wextra -Wpedantic -Wconversion -Wshadow)
  endif()
endfunction()

# stage(NAME SOURCES file... [USES stage...] [LINKS library...])
# One stage of the pipeline: a static library evenfield_NAME with the alias evenfield::NAME.
# USES is public (its headers may be included), LINKS is private (seen by no other stage).
function(stage name)
  cmake_parse_arguments(arg "" "" "SOURCES;USES;LINKS" ${ARGN})
  list(TRANSFORM arg_SOURCES PREPEND "${CMAKE_CURRENT_SOURCE_DIR}/${name}/")
  add_library(evenfield_${name} STATIC ${arg_SOURCES})
  add_library(evenfield::${name} ALIAS evenfield_${name})
  target_include_directories(evenfield_${name} PUBLIC ${CMAKE_CURRENT_SOURCE_DIR})
  list(TRANSFORM arg_USES PREPEND "evenfield::")
  target_link_libraries(evenfield_${name} PUBLIC ${arg_USES} PRIVATE ${arg_LINKS})
  evenfield_compile_rules(evenfield_${name})
endfunction()

# cases(FOLDER LABEL fast|slow SOURCES file... [USES stage...] [LINKS library...])
# The doctest cases of one folder of tests/, as one executable and one ctest entry.
function(cases folder)
  cmake_parse_arguments(arg "" "LABEL" "SOURCES;USES;LINKS" ${ARGN})
  list(TRANSFORM arg_SOURCES PREPEND "${CMAKE_CURRENT_SOURCE_DIR}/${folder}/")
  string(REPLACE "/" "_" target "${folder}_test")
  add_executable(${target} ${CMAKE_CURRENT_SOURCE_DIR}/main.cpp ${arg_SOURCES})
  list(TRANSFORM arg_USES PREPEND "evenfield::")
  target_include_directories(${target} PRIVATE ${CMAKE_CURRENT_SOURCE_DIR})
  target_link_libraries(${target} PRIVATE ${arg_USES} ${arg_LINKS} Threads::Threads)
  evenfield_compile_rules(${target})
  # Checks that call functions instead of unrolling: tests compile in half the time.
  target_compile_definitions(${target} PRIVATE DOCTEST_CONFIG_SUPER_FAST_ASSERTS EVENFIELD_SOURCE_DIR="${CMAKE_SOURCE_DIR}"
                                               EVENFIELD_PROGRAM="$<TARGET_FILE:evenfield>")
  add_dependencies(${target} evenfield)
  add_test(NAME ${folder} COMMAND ${target})
  set_tests_properties(${folder} PROPERTIES LABELS "${arg_LABEL}" WORKING_DIRECTORY ${CMAKE_SOURCE_DIR})
  # tests_fast and tests_slow build the program and the executables of one label.
  if(NOT TARGET tests_${arg_LABEL})
    add_custom_target(tests_${arg_LABEL})
  endif()
  add_dependencies(tests_${arg_LABEL} evenfield ${target})
endfunction()

# The system's python3 with Debian's packages: another one that comes first in the path may lack them.
find_program(EVENFIELD_PYTHON python3 PATHS /usr/bin NO_DEFAULT_PATH)
find_program(EVENFIELD_PYTHON python3)

# script_cases(SCRIPT LABEL fast|slow)
# A unittest script below tests/ as one ctest entry, named after it. It finds the program in EVENFIELD_PROGRAM.
function(script_cases script)
  cmake_parse_arguments(arg "" "LABEL" "" ${ARGN})
  string(REGEX REPLACE "(_test)?\\.py$" "" name "${script}")
  add_test(NAME ${name} COMMAND ${EVENFIELD_PYTHON} -B ${CMAKE_CURRENT_SOURCE_DIR}/${script})
  set_tests_properties(${name} PROPERTIES
    LABELS "${arg_LABEL}" WORKING_DIRECTORY ${CMAKE_SOURCE_DIR}
    ENVIRONMENT "EVENFIELD_PROGRAM=$<TARGET_FILE:evenfield>")
endfunction()
