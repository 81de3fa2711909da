/* main.c: signals and locale, then the command. */
#include <locale.h>
#include <signal.h>
#include <string.h>

#include "cli/commands.h"
#include "library/ampstead.h"

/* The one thing that outlives a call: set by the signal handler, read by the work. */
static volatile sig_atomic_t stop;

static void handle_interrupt(int signal_number)
{
    (void)signal_number;
    stop = 1;
}

/* The first Ctrl-C asks the work to end, a second one ends the program at once. */
static void catch_signals(void)
{
    struct sigaction action;
    memset(&action, 0, sizeof action);
    sigemptyset(&action.sa_mask);
    action.sa_handler = handle_interrupt;
    action.sa_flags = (int)SA_RESETHAND;
    (void)sigaction(SIGINT, &action, NULL);
    action.sa_handler = SIG_IGN; /* a closed pipe is then an error of the write */
    action.sa_flags = 0;
    (void)sigaction(SIGPIPE, &action, NULL);
}

int main(int argc, char **argv)
{
    struct options options;
    bool out_of_memory = false;
    catch_signals();
    (void)setlocale(LC_CTYPE, ""); /* which characters a terminal shows; numbers stay as they are */
    if (!options_parse(argc, argv, stderr, &options, &out_of_memory)) {
        if (out_of_memory) {
            fputs("ampstead: memory is short\n", stderr);
        }
        options_free(&options);
        return out_of_memory ? AMPSTEAD_MACHINE : AMPSTEAD_INPUT;
    }
    int status = command_run(&options, &stop);
    options_free(&options);
    return status;
}
