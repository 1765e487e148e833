# find_package(coilassay): the rooms as coilassay::base, coilassay::acquire, coilassay::fitting, coilassay::analysis and so on;
# headers as in the source, #include "analysis/ring_down.h".
include(${CMAKE_CURRENT_LIST_DIR}/coilassayDependencies.cmake)
include(${CMAKE_CURRENT_LIST_DIR}/coilassayTargets.cmake)
