# SPDX-License-Identifier: GPL-2.0-or-later
# What `cmake --install` and CPack put where. Included by the top CMakeLists.txt.
include(GNUInstallDirs)
include(CMakePackageConfigHelpers)

install(TARGETS deviascope_program RUNTIME DESTINATION ${CMAKE_INSTALL_BINDIR} COMPONENT program)
install(DIRECTORY ${PROJECT_SOURCE_DIR}/priors/
    DESTINATION ${CMAKE_INSTALL_DATADIR}/deviascope/priors COMPONENT program
    FILES_MATCHING PATTERN "*.toml")
install(FILES ${PROJECT_SOURCE_DIR}/README.md
    DESTINATION ${CMAKE_INSTALL_DOCDIR} COMPONENT program)
configure_file(${CMAKE_CURRENT_LIST_DIR}/deviascope.1.in ${PROJECT_BINARY_DIR}/deviascope.1 @ONLY)
install(FILES ${PROJECT_BINARY_DIR}/deviascope.1
    DESTINATION ${CMAKE_INSTALL_MANDIR}/man1 COMPONENT program)
install(FILES ${CMAKE_CURRENT_LIST_DIR}/completion.bash RENAME deviascope
    DESTINATION ${CMAKE_INSTALL_DATADIR}/bash-completion/completions COMPONENT program)
install(FILES ${CMAKE_CURRENT_LIST_DIR}/completion.zsh RENAME _deviascope
    DESTINATION ${CMAKE_INSTALL_DATADIR}/zsh/vendor-completions COMPONENT program)

# The library, for programs that say find_package(deviascope).
set(config_folder ${CMAKE_INSTALL_LIBDIR}/cmake/deviascope)
install(TARGETS deviascope deviascope_warnings EXPORT deviascopeTargets
    ARCHIVE DESTINATION ${CMAKE_INSTALL_LIBDIR} COMPONENT library
    INCLUDES DESTINATION ${CMAKE_INSTALL_INCLUDEDIR})
install(DIRECTORY ${PROJECT_SOURCE_DIR}/include/
    DESTINATION ${CMAKE_INSTALL_INCLUDEDIR} COMPONENT library)
install(EXPORT deviascopeTargets NAMESPACE deviascope::
    DESTINATION ${config_folder} COMPONENT library)
configure_package_config_file(${CMAKE_CURRENT_LIST_DIR}/deviascopeConfig.cmake.in
    ${PROJECT_BINARY_DIR}/deviascopeConfig.cmake INSTALL_DESTINATION ${config_folder})
write_basic_package_version_file(${PROJECT_BINARY_DIR}/deviascopeConfigVersion.cmake
    COMPATIBILITY SameMinorVersion)
install(FILES ${PROJECT_BINARY_DIR}/deviascopeConfig.cmake
    ${PROJECT_BINARY_DIR}/deviascopeConfigVersion.cmake
    DESTINATION ${config_folder} COMPONENT library)

# cpack -G DEB: the program alone, its libraries found by dpkg-shlibdeps.
set(CPACK_PACKAGE_NAME deviascope)
set(CPACK_PACKAGE_DESCRIPTION_SUMMARY "${PROJECT_DESCRIPTION}")
set(CPACK_PACKAGE_CONTACT "The deviascope developers <deviascope@localhost>")
set(CPACK_PACKAGING_INSTALL_PREFIX /usr)
set(CPACK_GENERATOR DEB)
set(CPACK_COMPONENTS_ALL program)
set(CPACK_DEB_COMPONENT_INSTALL ON)
set(CPACK_DEBIAN_PROGRAM_PACKAGE_NAME deviascope)
set(CPACK_DEBIAN_FILE_NAME DEB-DEFAULT)
set(CPACK_DEBIAN_PACKAGE_SECTION science)
set(CPACK_DEBIAN_PROGRAM_PACKAGE_DEPENDS "fonts-open-sans | fonts-dejavu-core")
set(CPACK_DEBIAN_PACKAGE_SHLIBDEPS ON)
set(CPACK_STRIP_FILES ON)
include(CPack)
