# One Debian package, slipbench, of all that is installed: `tools/package` builds it.
set(CPACK_GENERATOR DEB)
set(CPACK_PACKAGE_NAME slipbench)
set(CPACK_PACKAGE_CONTACT "slipbench developers")
set(CPACK_PACKAGING_INSTALL_PREFIX /usr)
set(CPACK_STRIP_FILES ON)
set(CPACK_INSTALL_DEFAULT_DIRECTORY_PERMISSIONS
    OWNER_READ OWNER_WRITE OWNER_EXECUTE GROUP_READ GROUP_EXECUTE WORLD_READ WORLD_EXECUTE)
set(CPACK_DEBIAN_FILE_NAME DEB-DEFAULT)
set(CPACK_DEBIAN_PACKAGE_SECTION electronics)
set(CPACK_DEBIAN_PACKAGE_SHLIBDEPS ON)
set(CPACK_DEBIAN_PACKAGE_CONTROL_STRICT_PERMISSION ON)
# For those who link the libraries, which stand in the same package; the command needs none of it.
set(CPACK_DEBIAN_PACKAGE_SUGGESTS "g++, cmake, libboost-dev, cppzmq-dev, libhdf5-dev")
set(CPACK_PACKAGE_DESCRIPTION_SUMMARY "bench for speed and flux estimators of induction-motor drives")
set(CPACK_DEBIAN_PACKAGE_DESCRIPTION "Simulates an induction-motor drive from a scenario file (machine, inverter, shaft, load, sensors,
control), lets speed and flux estimators ride along or close the loop, and
tells what each estimate was worth. Holds the command, example machines and
scenarios, and headers and libraries for programs that bring an estimator of
their own.
A simulation does not replace commissioning by qualified people under local
codes. Licence: MIT.")

install(FILES LICENSE DESTINATION ${CMAKE_INSTALL_DOCDIR} RENAME copyright)
include(CPack)
