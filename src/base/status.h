/*
 * status.h: how a call ended. Every function that can fail returns one of these; the details of
 * a wrong input are in the diagnostics, those of a search that found nothing in its report.
 */
#ifndef BASE_STATUS_H
#define BASE_STATUS_H

enum status {
    STATUS_OK = 0,
    STATUS_INPUT,    /* the input is wrong; the diagnostics say where and why */
    STATUS_UNSOLVED, /* no operating point was found */
    STATUS_MEMORY,   /* an allocation failed */
    STATUS_FILE,     /* a file could not be read or written */
    STATUS_STOPPED   /* the user asked to stop */
};

#endif
