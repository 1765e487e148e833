# cmake --install build: the program, its manual page, completion for bash, licence and documents.
include(GNUInstallDirs)

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
