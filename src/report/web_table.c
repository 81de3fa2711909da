/* web_table.c: tables of the page, with the values by which they sort. */
#include <math.h>

#include "report/markup.h"
#include "report/web.h"

void web_table_begin(struct web_table *table, struct buffer *out, const char *caption,
                     const char *const *heads, const bool *numbers, int count)
{
    *table = (struct web_table){out, 0, 0};
    buffer_text(out, "<div class=\"wide\" tabindex=\"0\" role=\"group\" aria-label=\"");
    markup_text(out, caption);
    buffer_text(out, "\"><table class=\"sorts\"><caption>");
    markup_text(out, caption);
    buffer_text(out, "</caption><thead><tr>");
    for (int k = 0; k < count; k++) {
        buffer_format(out, "<th scope=\"col\"%s>", numbers[k] ? " class=\"n\"" : "");
        buffer_text(out, heads[k][0] != '\0' ? "<button type=\"button\">" : "");
        markup_text(out, heads[k]);
        buffer_text(out, heads[k][0] != '\0' ? "</button></th>" : "</th>");
    }
    buffer_text(out, "</tr></thead><tbody>\n");
}

void web_table_row(struct web_table *table)
{
    buffer_text(table->out, table->row_count > 0 ? "</tr>\n<tr>" : "<tr>");
    table->row_count++;
}

void web_table_text(struct web_table *table, const char *text)
{
    buffer_text(table->out, "<td>");
    markup_text(table->out, text);
    buffer_text(table->out, "</td>");
}

void web_table_name(struct web_table *table, const char *text, int line)
{
    buffer_text(table->out, "<th scope=\"row\">");
    if (line > 0) {
        buffer_format(table->out, "<a href=\"#L%d\">", line);
    }
    markup_text(table->out, text);
    buffer_text(table->out, line > 0 ? "</a></th>" : "</th>");
}

void web_table_value(struct web_table *table, double value, const char *shown)
{
    buffer_text(table->out, "<td class=\"n\"");
    if (isfinite(value)) {
        buffer_text(table->out, " data-value=\"");
        markup_number(table->out, value);
        buffer_text(table->out, "\"");
    }
    buffer_text(table->out, ">");
    markup_text(table->out, shown);
    buffer_text(table->out, "</td>");
}

void web_table_bar(struct web_table *table, double share)
{
    struct buffer *out = table->out;
    if (!isfinite(share)) {
        buffer_text(out, "<td></td>");
        return;
    }
    double width = 50.0 * fmin(fabs(share), 1.0);
    buffer_text(out, "<td data-value=\"");
    markup_number(out, share);
    buffer_format(out, "\"><div class=\"bar\" aria-hidden=\"true\"><i%s style=\"left:",
                  share < 0.0 ? " class=\"minus\"" : "");
    markup_fixed(out, share < 0.0 ? 50.0 - width : 50.0, 2);
    buffer_text(out, "%;width:");
    markup_fixed(out, width, 2);
    buffer_text(out, "%\"></i></div></td>");
}

void web_table_length(struct web_table *table, double share)
{
    struct buffer *out = table->out;
    if (!isfinite(share)) {
        buffer_text(out, "<td></td>");
        return;
    }
    buffer_text(out, "<td data-value=\"");
    markup_number(out, share);
    buffer_text(out, "\"><div class=\"bar from\" aria-hidden=\"true\"><i style=\"left:0;width:");
    markup_fixed(out, 100.0 * fmin(fmax(share, 0.0), 1.0), 2);
    buffer_text(out, "%\"></i></div></td>");
}

void web_table_end(struct web_table *table)
{
    buffer_text(table->out, table->row_count > 0 ? "</tr>\n" : "");
    buffer_text(table->out, "</tbody></table></div>\n");
}
