/*
 * picture_module.c: an SVG text as PDF or PNG, by librsvg and cairo. A module of its own, loaded
 * only when such a picture is wanted: loading these libraries takes longer than a whole review.
 */
#include <cairo-pdf.h>
#include <cairo.h>
#include <librsvg/rsvg.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "cli/picture.h"

/* A PNG has two pixels for each of the drawing's, so that it is sharp on paper too. */
static const double png_scale = 2.0;
/* A drawing's px is 1/96 inch (CSS), a point of PDF 1/72. */
static const double pdf_scale = 0.75;

static cairo_status_t take_bytes(void *self, const unsigned char *data, unsigned length)
{
    struct picture *picture = self;
    if (length > picture->capacity - picture->length) {
        size_t capacity = 2 * (picture->capacity + length);
        char *grown = realloc(picture->data, capacity);
        if (grown == NULL) {
            return CAIRO_STATUS_NO_MEMORY;
        }
        picture->data = grown;
        picture->capacity = capacity;
    }
    memcpy(picture->data + picture->length, data, length);
    picture->length += length;
    return CAIRO_STATUS_SUCCESS;
}

static cairo_status_t draw(RsvgHandle *handle, cairo_surface_t *surface, double scale, double width,
                           double height)
{
    const RsvgRectangle room = {0.0, 0.0, width, height};
    cairo_t *context = cairo_create(surface);
    cairo_scale(context, scale, scale);
    bool is_drawn = rsvg_handle_render_document(handle, context, &room, NULL);
    cairo_status_t status = cairo_status(context);
    cairo_destroy(context);
    return !is_drawn && status == CAIRO_STATUS_SUCCESS ? CAIRO_STATUS_READ_ERROR : status;
}

static cairo_status_t draw_pdf(RsvgHandle *handle, double width, double height,
                               struct picture *picture)
{
    cairo_surface_t *surface = cairo_pdf_surface_create_for_stream(
        take_bytes, picture, width * pdf_scale, height * pdf_scale);
    /* the same cell gives the same bytes whenever it is drawn */
    cairo_pdf_surface_set_metadata(surface, CAIRO_PDF_METADATA_CREATE_DATE, "2000-01-01T00:00:00Z");
    cairo_status_t status = draw(handle, surface, pdf_scale, width, height);
    cairo_surface_finish(surface);
    if (status == CAIRO_STATUS_SUCCESS) {
        status = cairo_surface_status(surface);
    }
    cairo_surface_destroy(surface);
    return status;
}

static cairo_status_t draw_png(RsvgHandle *handle, double width, double height,
                               struct picture *picture)
{
    cairo_surface_t *surface = cairo_image_surface_create(
        CAIRO_FORMAT_RGB24, (int)lround(width * png_scale), (int)lround(height * png_scale));
    cairo_status_t status = draw(handle, surface, png_scale, width, height);
    if (status == CAIRO_STATUS_SUCCESS) {
        status = cairo_surface_write_to_png_stream(surface, take_bytes, picture);
    }
    cairo_surface_destroy(surface);
    return status;
}

__attribute__((visibility("default"))) const char *
picture_convert(const char *svg, enum picture_form form, struct picture *picture)
{
    gdouble width = 0.0, height = 0.0;
    RsvgHandle *handle = rsvg_handle_new_from_data((const guint8 *)svg, (gsize)strlen(svg), NULL);
    if (handle == NULL || !rsvg_handle_get_intrinsic_size_in_pixels(handle, &width, &height)) {
        g_clear_object(&handle);
        return "the picture could not be converted";
    }
    cairo_status_t status = form == PICTURE_PDF ? draw_pdf(handle, width, height, picture)
                                                : draw_png(handle, width, height, picture);
    g_object_unref(handle);
    return status == CAIRO_STATUS_SUCCESS ? NULL : cairo_status_to_string(status);
}
