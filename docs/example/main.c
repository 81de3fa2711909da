/* main.c: an example of libampstead: the current of one output at three temperatures. */
#include <ampstead.h>
#include <stdio.h>

int main(int argc, char **argv)
{
    static const char *const temperatures[] = {"-20 C", "27 C", "85 C"};
    if (argc != 3) {
        fputs("usage: example FILE.cell QUANTITY\n", stderr);
        return AMPSTEAD_INPUT;
    }
    printf("libampstead %s (%s)\n", ampstead_version(), ampstead_build());
    for (int k = 0; k < 3; k++) {
        struct ampstead_request request = AMPSTEAD_REQUEST;
        struct ampstead_result *result = NULL;
        double value;
        request.path = argv[1];
        request.temperature = temperatures[k];
        if (ampstead_run(&request, &result) <= AMPSTEAD_NOT_MET &&
            ampstead_result_value(result, argv[2], &value)) {
            printf("%6s  %s = %.6g\n", temperatures[k], argv[2], value);
        } else {
            fputs(ampstead_result_messages(result, 0), stderr);
        }
        ampstead_result_free(result);
    }
    return 0;
}
