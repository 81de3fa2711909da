# ampsteadConfig.cmake: the target ampstead::ampstead, installed with the library.
include(${CMAKE_CURRENT_LIST_DIR}/ampsteadTargets.cmake)
