#!/bin/sh
# symbols_test.sh LIBRARY NM: every defined dynamic symbol must be one of the public functions.
set -eu
found=$("$2" -D --defined-only "$1" | awk '{ print $NF }' | grep -v '^_' | sort)
wanted="ampstead_build
ampstead_calibrate
ampstead_calibration_free
ampstead_calibration_json
ampstead_calibration_messages
ampstead_calibration_plot
ampstead_calibration_process
ampstead_calibration_text
ampstead_result_cell
ampstead_result_csv
ampstead_result_file
ampstead_result_free
ampstead_result_json
ampstead_result_messages
ampstead_result_page
ampstead_result_part
ampstead_result_plot
ampstead_result_status
ampstead_result_text
ampstead_result_value
ampstead_run
ampstead_version"
if [ "$found" != "$wanted" ]; then
    echo "visible symbols:"
    echo "$found"
    exit 1
fi
