# What `cmake --install` lays down: the command (its own CMakeLists), libraries, headers, the package for find_package, examples.
include(CMakePackageConfigHelpers)

set(package_dir ${CMAKE_INSTALL_LIBDIR}/cmake/slipbench)
set(header_dir ${CMAKE_INSTALL_INCLUDEDIR}/slipbench)
set(exported)
set(dependencies)

# slipbench_export(name [dependency...]): library `name` becomes slipbench::name in libslipbench_name.a. Each dependency is what
# find_dependency() needs to find for it, libraries that are linked privately included: a static library needs them too.
# The options that keep the bits go along: code of a program's own meets the same inline functions as the library's.
function(slipbench_export name)
  get_target_property(includes ${name} INTERFACE_INCLUDE_DIRECTORIES)
  list(REMOVE_ITEM includes ${CMAKE_SOURCE_DIR})
  list(APPEND includes $<BUILD_INTERFACE:${CMAKE_SOURCE_DIR}> $<INSTALL_INTERFACE:${header_dir}>)
  set_target_properties(${name} PROPERTIES OUTPUT_NAME slipbench_${name} INTERFACE_INCLUDE_DIRECTORIES "${includes}")
  target_compile_features(${name} INTERFACE cxx_std_20)
  target_compile_options(${name} INTERFACE $<INSTALL_INTERFACE:-ffp-contract=off> $<INSTALL_INTERFACE:-fno-math-errno>)
  install(TARGETS ${name} EXPORT slipbench ARCHIVE DESTINATION ${CMAKE_INSTALL_LIBDIR})
  set(exported ${exported} ${name} PARENT_SCOPE)
  set(dependencies ${dependencies} ${ARGN} PARENT_SCOPE)
endfunction()

slipbench_export(plant)
slipbench_export(linear "Eigen3 3.4")
slipbench_export(estimators)
slipbench_export(controllers)
slipbench_export(scenario)
slipbench_export(system_file "Eigen3 3.4")
slipbench_export(engine "Boost 1.74")
slipbench_export(lanes)
slipbench_export(sim_linear)
slipbench_export(score "Boost 1.74")
slipbench_export(record)
slipbench_export(board fmt)
slipbench_export(exporter fmt)
slipbench_export(sweep SQLite3 NLopt Threads)
if(TARGET stream)
  slipbench_export(stream "Boost 1.74" cppzmq Threads)
endif()

# slipbench::slipbench: all of them.
add_library(all_libraries INTERFACE)
set_target_properties(all_libraries PROPERTIES EXPORT_NAME slipbench)
target_link_libraries(all_libraries INTERFACE ${exported})
install(TARGETS all_libraries EXPORT slipbench)
install(EXPORT slipbench NAMESPACE slipbench:: FILE slipbenchTargets.cmake DESTINATION ${package_dir})

list(REMOVE_DUPLICATES dependencies)
list(TRANSFORM dependencies REPLACE "(.+)" "find_dependency(\\1)")
list(JOIN dependencies "\n" find_dependencies)
configure_package_config_file(${CMAKE_CURRENT_LIST_DIR}/slipbenchConfig.cmake.in ${CMAKE_BINARY_DIR}/slipbenchConfig.cmake
                              INSTALL_DESTINATION ${package_dir} PATH_VARS CMAKE_INSTALL_DATADIR)
# Before 1.0 a minor version may change what is promised.
write_basic_package_version_file(${CMAKE_BINARY_DIR}/slipbenchConfigVersion.cmake COMPATIBILITY SameMinorVersion)
install(FILES ${CMAKE_BINARY_DIR}/slipbenchConfig.cmake ${CMAKE_BINARY_DIR}/slipbenchConfigVersion.cmake
        DESTINATION ${package_dir})

file(GLOB_RECURSE headers CONFIGURE_DEPENDS RELATIVE ${CMAKE_SOURCE_DIR} plant/*.h* estimators/*.h* controllers/*.h* sim/*.h*)
foreach(header IN LISTS headers)
  get_filename_component(folder ${header} DIRECTORY)
  install(FILES ${header} DESTINATION ${header_dir}/${folder})
endforeach()

install(DIRECTORY configs DESTINATION ${CMAKE_INSTALL_DATADIR}/slipbench)
install(FILES README.md LICENSE DESTINATION ${CMAKE_INSTALL_DOCDIR})
install(FILES sim/stream/README.md DESTINATION ${CMAKE_INSTALL_DOCDIR}/sim/stream)  # the protocol, where README.md points to it
install(FILES sim/board/README.md DESTINATION ${CMAKE_INSTALL_DOCDIR}/sim/board)
