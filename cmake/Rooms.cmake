# One static library a room. A room sees the public headers of all, its own sources, and links only the rooms it names:
# an include that runs back fails tests/layers, and a call that runs back fails to link.

find_package(PkgConfig REQUIRED)
find_package(Eigen3 3.4 REQUIRED NO_MODULE)
find_package(fmt REQUIRED)
find_package(nlohmann_json 3.11 REQUIRED)
find_package(Boost 1.74 REQUIRED)
find_package(Threads REQUIRED)
find_package(OpenSSL REQUIRED)
find_package(SQLiteCpp REQUIRED)
pkg_check_modules(FFTW3 REQUIRED IMPORTED_TARGET fftw3)
pkg_check_modules(SNDFILE REQUIRED IMPORTED_TARGET sndfile)
pkg_check_modules(CAIRO REQUIRED IMPORTED_TARGET cairo cairo-pdf cairo-svg cairo-png)
pkg_check_modules(PANGO REQUIRED IMPORTED_TARGET pangocairo)
pkg_check_modules(PLPLOT REQUIRED IMPORTED_TARGET plplot)

add_library(ringwright_flags INTERFACE)
target_compile_options(ringwright_flags INTERFACE
  -Wall -Wextra -Wpedantic -Wconversion -Wshadow -Werror)
if(RINGWRIGHT_SANITIZE STREQUAL "thread")
  target_compile_options(ringwright_flags INTERFACE -fsanitize=thread -fno-omit-frame-pointer
    # What Catch2 and Boost do with fences, the sanitizer does not see.
    $<$<CXX_COMPILER_ID:GNU>:-Wno-tsan> $<$<CXX_COMPILER_ID:GNU>:-Wno-maybe-uninitialized>)
  target_link_options(ringwright_flags INTERFACE -fsanitize=thread)
elseif(RINGWRIGHT_SANITIZE)
  target_compile_options(ringwright_flags INTERFACE
    -fsanitize=address,undefined -fno-sanitize-recover=all -fno-omit-frame-pointer
    # GCC 12 takes what the sanitizers add for reads of values that were never set.
    $<$<CXX_COMPILER_ID:GNU>:-Wno-maybe-uninitialized>)
  target_link_options(ringwright_flags INTERFACE -fsanitize=address,undefined)
endif()
if(RINGWRIGHT_FUZZ)
  if(NOT CMAKE_CXX_COMPILER_ID MATCHES Clang)
    message(FATAL_ERROR "RINGWRIGHT_FUZZ needs clang: CC=clang-14 CXX=clang++-14 cmake …")
  endif()
  target_compile_options(ringwright_flags INTERFACE -fsanitize=fuzzer-no-link,address,undefined
    -fno-sanitize-recover=all -fno-omit-frame-pointer)
  target_link_options(ringwright_flags INTERFACE -fsanitize=address,undefined)
endif()

# Libraries that the program carries within itself where Debian has them as archives, so that it starts without loading
# them (docs/decisions/few-libraries.md). Everything else that is built links them as usual.
option(RINGWRIGHT_FEW_LIBRARIES "The program carries FFTW, SQLite, libcrypto and the C++ library within itself" ON)
if(RINGWRIGHT_SANITIZE OR RINGWRIGHT_FUZZ)
  set(RINGWRIGHT_FEW_LIBRARIES OFF)
endif()
function(ringwright_carried variable archive usual)
  find_library(RINGWRIGHT_ARCHIVE_${archive} lib${archive}.a)
  mark_as_advanced(RINGWRIGHT_ARCHIVE_${archive})
  if(RINGWRIGHT_FEW_LIBRARIES AND RINGWRIGHT_ARCHIVE_${archive})
    # The property is that of the program or test that is linked in the end.
    set(usual "$<IF:$<BOOL:$<TARGET_PROPERTY:RINGWRIGHT_CARRIES>>,${RINGWRIGHT_ARCHIVE_${archive}},${usual}>")
  endif()
  set(${variable} "${usual}" PARENT_SCOPE)
endfunction()
ringwright_carried(fftw fftw3 PkgConfig::FFTW3)
ringwright_carried(crypto crypto OpenSSL::Crypto)
ringwright_carried(sqlite sqlite3 sqlite3)
ringwright_carried(sqlite_cpp SQLiteCpp SQLiteCpp)

# What each room takes from outside the project.
set(ringwright_value_libraries ${fftw} fmt::fmt Threads::Threads)
# libsndfile is loaded when the first sound file is read.
set(ringwright_recording_libraries ${crypto} fmt::fmt Threads::Threads ${CMAKE_DL_LIBS})
set(ringwright_event_libraries Eigen3::Eigen fmt::fmt)
set(ringwright_uncertainty_libraries Eigen3::Eigen Boost::headers fmt::fmt)
set(ringwright_identify_libraries Eigen3::Eigen Boost::headers fmt::fmt)
set(ringwright_property_libraries Boost::headers Eigen3::Eigen fmt::fmt)
set(ringwright_analysis_libraries fmt::fmt)
set(ringwright_conformity_libraries Boost::headers Eigen3::Eigen fmt::fmt)
set(ringwright_ledger_libraries ${sqlite_cpp} ${sqlite} ${crypto} Boost::headers Eigen3::Eigen fmt::fmt
    nlohmann_json::nlohmann_json)
set(ringwright_report_libraries fmt::fmt nlohmann_json::nlohmann_json Boost::headers)
set(ringwright_drawing_libraries fmt::fmt nlohmann_json::nlohmann_json OpenSSL::Crypto PkgConfig::CAIRO PkgConfig::PANGO
    PkgConfig::PLPLOT)

function(ringwright_room name)
  cmake_parse_arguments(room "" "" "USES" ${ARGN})
  file(GLOB sources CONFIGURE_DEPENDS ${PROJECT_SOURCE_DIR}/src/${name}/*.cpp)
  set(target ringwright_${name})
  if(NOT sources)
    add_library(${target} INTERFACE)
    target_include_directories(${target} INTERFACE ${PROJECT_SOURCE_DIR}/include)
    return()
  endif()
  add_library(${target} STATIC ${sources})
  target_include_directories(${target} PUBLIC ${PROJECT_SOURCE_DIR}/include PRIVATE ${PROJECT_SOURCE_DIR}/src)
  target_compile_definitions(${target} PRIVATE RINGWRIGHT_VERSION="${PROJECT_VERSION}")
  target_link_libraries(${target} PRIVATE ringwright_flags ${ringwright_${name}_libraries})
  foreach(used IN LISTS room_USES)
    target_link_libraries(${target} PUBLIC ringwright_${used})
  endforeach()
endfunction()

# The planner's decisions, made once by the build and compiled into the room of values.
function(ringwright_transform_plans)
  set(table ${PROJECT_BINARY_DIR}/transform_plans.cpp)
  add_executable(write_transform_plans ${PROJECT_SOURCE_DIR}/cmake/write_transform_plans.cpp)
  target_link_libraries(write_transform_plans PRIVATE ringwright_flags ${fftw})
  set_target_properties(write_transform_plans PROPERTIES RINGWRIGHT_CARRIES ON
    RUNTIME_OUTPUT_DIRECTORY ${PROJECT_BINARY_DIR}/CMakeFiles)
  add_custom_command(OUTPUT ${table} COMMAND write_transform_plans ${table} VERBATIM)
  target_sources(ringwright_value PRIVATE ${table})
endfunction()

# `ringwright`: all rooms as one name, for callers who link the library.
function(ringwright_umbrella target)
  add_library(${target} INTERFACE)
  target_link_libraries(${target} INTERFACE ringwright_drawing ringwright_report ringwright_ledger ringwright_conformity
    ringwright_analysis ringwright_property ringwright_identify ringwright_uncertainty ringwright_event
    ringwright_recording ringwright_value)
endfunction()

# The drawing room as a module beside the program, loaded by it when it draws (docs/decisions/drawing-module.md).
function(ringwright_drawing_module target)
  # What the module takes in has to be position-independent.
  foreach(room value recording drawing)
    set_target_properties(ringwright_${room} PROPERTIES POSITION_INDEPENDENT_CODE ON)
  endforeach()
  add_library(${target} MODULE ${PROJECT_SOURCE_DIR}/src/drawing/drawing_module.cpp)
  set_target_properties(${target} PROPERTIES PREFIX "" OUTPUT_NAME ringwright_drawing
    LIBRARY_OUTPUT_DIRECTORY ${CMAKE_RUNTIME_OUTPUT_DIRECTORY})
  target_link_options(${target} PRIVATE -Wl,--as-needed -Wl,--exclude-libs,ALL)
  if(NOT RINGWRIGHT_SANITIZE AND NOT RINGWRIGHT_FUZZ)  # clang links the sanitizers' runtime into programs alone
    target_link_options(${target} PRIVATE -Wl,--no-undefined)
  endif()
  target_link_libraries(${target} PRIVATE ringwright_drawing ringwright_flags)
endfunction()

# The program: build/ringwright, a thin client of the library.
function(ringwright_program target library)
  file(GLOB sources CONFIGURE_DEPENDS ${PROJECT_SOURCE_DIR}/src/app/*.cpp)
  if(NOT sources)
    return()
  endif()
  add_executable(${target} ${sources})
  set_target_properties(${target} PROPERTIES OUTPUT_NAME ringwright)
  # The drawing libraries stay out of the program: a third of the time of a short command went into loading them.
  target_link_options(${target} PRIVATE -Wl,--as-needed)
  if(RINGWRIGHT_FEW_LIBRARIES)
    set_target_properties(${target} PROPERTIES RINGWRIGHT_CARRIES ON)
    target_link_options(${target} PRIVATE -static-libstdc++ -static-libgcc -no-pie)
  endif()
  add_dependencies(${target} ringwright_drawing_module)
  target_include_directories(${target} PRIVATE ${PROJECT_SOURCE_DIR}/src)
  target_compile_definitions(${target} PRIVATE RINGWRIGHT_VERSION="${PROJECT_VERSION}")
  target_link_libraries(${target} PRIVATE ${library} ringwright_flags ${crypto} fmt::fmt nlohmann_json::nlohmann_json)
endfunction()
