# coilassay_room(<name> SOURCES <cpp...> HEADERS <h...> PUBLIC <targets...> PRIVATE <targets...>)
#
# One room, one static library coilassay_<name>. Files are given relative to the source root's room folder. Headers form
# a file set, so that all_verify_interface_header_sets compiles each of them alone.
function(coilassay_room name)
  cmake_parse_arguments(PARSE_ARGV 1 room "" "" "SOURCES;HEADERS;PUBLIC;PRIVATE")
  if(room_UNPARSED_ARGUMENTS)
    message(FATAL_ERROR "coilassay_room(${name}): what is ${room_UNPARSED_ARGUMENTS}?")
  endif()
  add_library(coilassay_${name} STATIC)
  target_sources(coilassay_${name}
    PRIVATE ${room_SOURCES}
    PUBLIC FILE_SET HEADERS BASE_DIRS ${PROJECT_SOURCE_DIR} FILES ${room_HEADERS})
  target_compile_features(coilassay_${name} PUBLIC cxx_std_20)
  target_link_libraries(coilassay_${name}
    PUBLIC ${room_PUBLIC}
    PRIVATE ${room_PRIVATE} $<BUILD_INTERFACE:coilassay_warnings>)
  set_target_properties(coilassay_${name} PROPERTIES VERIFY_INTERFACE_HEADER_SETS ON EXPORT_NAME ${name})
  set_property(GLOBAL APPEND PROPERTY COILASSAY_ROOMS coilassay_${name})
endfunction()
