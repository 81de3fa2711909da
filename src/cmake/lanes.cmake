# Vectors of samples (base/lanes.h): the widths that this processor family and compiler have.
# lanes_objects(NAME FILES...): compiles the files once a width; the objects come back in ${NAME}.
option(AMPSTEAD_LANES "mismatch samples side by side, on processors with AVX2 or AVX-512" ON)
set(lanes_widths)
set(lanes_options_8 -mavx512f -mavx512dq -mavx2 -mfma -mprefer-vector-width=512)
set(lanes_options_4 -mavx2 -mfma)
if(AMPSTEAD_LANES AND CMAKE_SYSTEM_PROCESSOR MATCHES "x86_64|amd64|AMD64")
    include(CheckCCompilerFlag)
    check_c_compiler_flag("-mavx512f -mavx512dq -mavx2 -mfma -mprefer-vector-width=512"
        AMPSTEAD_HAS_LANES)
    if(AMPSTEAD_HAS_LANES)
        set(lanes_widths 4 8)
    endif()
endif()

function(lanes_objects name)
    set(objects)
    foreach(width ${lanes_widths})
        add_library(${name}_${width} OBJECT ${ARGN})
        target_compile_definitions(${name}_${width} PRIVATE LANES=${width})
        # a fused product is nearer to the truth, and a lane is its own in any case
        target_compile_options(${name}_${width} PRIVATE ${lanes_options_${width}}
            -ffp-contract=fast)
        target_include_directories(${name}_${width} PRIVATE ${CMAKE_SOURCE_DIR}/src)
        list(APPEND objects $<TARGET_OBJECTS:${name}_${width}>)
    endforeach()
    set(${name} ${objects} PARENT_SCOPE)
endfunction()
