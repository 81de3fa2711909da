/* place.h: where the library lies. Private to library/. */
#ifndef LIBRARY_PLACE_H
#define LIBRARY_PLACE_H

/* The folder of the models installed with this library, also when everything was moved; malloc'd,
 * NULL when memory is short. */
char *place_models(void);

#endif
