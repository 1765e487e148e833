# cmake --install build: the program, its manual page, completion for bash, licence and documents; and, as a part of its own
# ("development"), the rooms as libraries for other programs: find_package(coilassay) and coilassay::analysis.
include(GNUInstallDirs)
include(CMakePackageConfigHelpers)
set(CMAKE_INSTALL_DEFAULT_COMPONENT_NAME program)

install(TARGETS coilassay RUNTIME DESTINATION ${CMAKE_INSTALL_BINDIR})

# Both are written by the program itself, so that they say what it really takes.
set(reference_dir ${PROJECT_BINARY_DIR}/reference)
file(MAKE_DIRECTORY ${reference_dir})
add_custom_command(
  OUTPUT ${reference_dir}/coilassay.1 ${reference_dir}/coilassay.bash
  COMMAND coilassay man > ${reference_dir}/coilassay.1
  COMMAND coilassay completion bash > ${reference_dir}/coilassay.bash
  DEPENDS coilassay VERBATIM COMMENT "Manual page and completion")
add_custom_target(reference ALL DEPENDS ${reference_dir}/coilassay.1 ${reference_dir}/coilassay.bash)

install(FILES ${reference_dir}/coilassay.1 DESTINATION ${CMAKE_INSTALL_MANDIR}/man1)
install(FILES ${reference_dir}/coilassay.bash DESTINATION ${CMAKE_INSTALL_DATADIR}/bash-completion/completions RENAME coilassay)
install(FILES LICENSE NOTICE.md README.md CHANGELOG.md DESTINATION ${CMAKE_INSTALL_DOCDIR})
install(DIRECTORY docs DESTINATION ${CMAKE_INSTALL_DOCDIR})

# All rooms but the keyboard. The package looks for the same libraries as the build does, by the same file.
get_property(rooms GLOBAL PROPERTY COILASSAY_ROOMS)
list(REMOVE_ITEM rooms coilassay_commands)
set(package_dir ${CMAKE_INSTALL_LIBDIR}/cmake/coilassay)
install(TARGETS ${rooms} EXPORT coilassay COMPONENT development
        ARCHIVE DESTINATION ${CMAKE_INSTALL_LIBDIR}
        FILE_SET HEADERS DESTINATION ${CMAKE_INSTALL_INCLUDEDIR}/coilassay)
install(EXPORT coilassay NAMESPACE coilassay:: FILE coilassayTargets.cmake DESTINATION ${package_dir} COMPONENT development)
write_basic_package_version_file(${PROJECT_BINARY_DIR}/coilassayConfigVersion.cmake COMPATIBILITY SameMinorVersion)
install(FILES ${PROJECT_SOURCE_DIR}/cmake/coilassayConfig.cmake ${PROJECT_BINARY_DIR}/coilassayConfigVersion.cmake
        DESTINATION ${package_dir} COMPONENT development)
install(FILES ${PROJECT_SOURCE_DIR}/cmake/dependencies.cmake DESTINATION ${package_dir} RENAME coilassayDependencies.cmake
        COMPONENT development)

# cpack --config build/CPackConfig.cmake: coilassay_*.deb, and coilassay-dev_*.deb with the libraries.
set(CPACK_GENERATOR DEB)
set(CPACK_PACKAGE_NAME coilassay)
set(CPACK_PACKAGE_CONTACT "the coilassay project")
set(CPACK_PACKAGE_DESCRIPTION_SUMMARY "${PROJECT_DESCRIPTION}")
set(CPACK_PACKAGING_INSTALL_PREFIX /usr)
set(CPACK_STRIP_FILES ON)
set(CPACK_COMPONENTS_ALL program development)
set(CPACK_COMPONENTS_GROUPING IGNORE)
set(CPACK_DEB_COMPONENT_INSTALL ON)
set(CPACK_DEBIAN_FILE_NAME DEB-DEFAULT)
set(CPACK_DEBIAN_PACKAGE_SECTION science)
set(CPACK_DEBIAN_PROGRAM_PACKAGE_NAME coilassay)
set(CPACK_DEBIAN_PROGRAM_PACKAGE_SHLIBDEPS ON)
set(CPACK_DEBIAN_PROGRAM_PACKAGE_RECOMMENDS gnuplot-nox)
set(CPACK_DEBIAN_PROGRAM_PACKAGE_SUGGESTS chromium)
set(CPACK_DEBIAN_DEVELOPMENT_PACKAGE_NAME coilassay-dev)
set(CPACK_DEBIAN_DEVELOPMENT_PACKAGE_SECTION libdevel)
# Who links the libraries needs what they were built with; the list is that of the scripts.
file(READ ${PROJECT_SOURCE_DIR}/cmake/debian-packages.sh listed)
string(REGEX MATCH "packages_to_build='([^']*)'" listed "${listed}")
string(REGEX MATCHALL "[a-z0-9.+-]+-dev" development_packages "${CMAKE_MATCH_1}")
list(JOIN development_packages ", " development_packages)
set(CPACK_DEBIAN_DEVELOPMENT_PACKAGE_DEPENDS "pkg-config, ${development_packages}")
include(CPack)
