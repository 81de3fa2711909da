/* figures_ranked.c: bars that lie: shares of the effects behind a difference, and derivatives. */
#include "report/figures_parts.h"

#include <math.h>
#include <string.h>

#include "analyses/explain.h"
#include "analyses/sensitivity.h"
#include "report/markup.h"
#include "report/page_parts.h"
#include "report/show.h"

enum { ROWS_SHOWN = 20 };

static const char *units(struct layout *layout, const char *shown)
{
    return markup_units(layout->arena, shown);
}

static bool add_reasons(struct layout *layout, struct figure_list *figures,
                        const struct explanation *e)
{
    struct figure *figure = figures_add(layout, figures);
    if (figure == NULL || !figures_rows(layout, figure, e->share_count + 1)) {
        return false;
    }
    figure->title = layout_format(layout, "%s: why it differs from the paper",
                                  layout_short(layout, e->hand->probe.text, 40));
    figures_note(figure, layout_format(layout, "paper %s, square law %s, computed %s%s",
                                       units(layout, why_value(layout, e, e->paper)),
                                       units(layout, why_value(layout, e, e->hand_view)),
                                       units(layout, why_value(layout, e, e->computed)),
                                       e->as_conductance ? ", as the conductance 1/R" : ""));
    for (int k = 0; k < e->share_count; k++) {
        if (why_matters(e, k)) {
            figures_row(figure, layout_short(layout, e->shares[k].effect, 44), e->shares[k].share,
                        units(layout, why_change(layout, e, e->shares[k].share)), "");
        }
    }
    figures_row(figure, "together", e->computed - e->paper,
                units(layout, why_change(layout, e, e->computed - e->paper)), "");
    figure->rows[figure->row_count - 1].is_sum = true;
    return true;
}

struct figure_list figures_of_reasons(struct layout *layout, const struct result *result)
{
    struct figure_list figures = {NULL, 0, 0};
    for (int k = 0; k < result->explanation_count; k++) {
        if (result->explanations[k].trouble == NULL &&
            !add_reasons(layout, &figures, &result->explanations[k])) {
            break;
        }
    }
    return figures;
}

static bool add_ranking(struct layout *layout, struct figure_list *figures,
                        const struct sensitivity_table *it)
{
    struct figure *figure = figures_add(layout, figures);
    const int acting = it->row_count - it->idle_count;
    const int count = acting < ROWS_SHOWN ? acting : ROWS_SHOWN;
    if (figure == NULL || !figures_rows(layout, figure, count)) {
        return false;
    }
    figure->title = layout_format(layout, "%s: what +1 %% of each parameter does to it",
                                  layout_short(layout, it->probe.text, 40));
    figures_note(figure, layout_format(layout, "%s is %s", layout_short(layout, it->probe.text, 40),
                                       units(layout, show_probe(layout, &it->probe, it->value))));
    for (int k = 0; k < count; k++) {
        const struct sensitivity_row *row = &it->rows[k];
        if (isfinite(row->relative)) {
            const bool hot = strcmp(row->parameter, "temperature") == 0;
            figures_row(figure, layout_short(layout, row->parameter, 34), row->relative,
                        hot ? show_share(layout, row->absolute / it->value, "/K", true)
                            : show_share(layout, row->relative / 100, "", true),
                        "");
        }
    }
    if (acting > count) {
        figures_note(figure,
                     layout_format(layout, "the strongest %d of %d that act", count, acting));
    }
    return true;
}

struct figure_list figures_of_ranking(struct layout *layout, const struct result *result)
{
    struct figure_list figures = {NULL, 0, 0};
    for (int k = 0; k < result->sensitivity_count; k++) {
        const struct sensitivity_table *it = &result->sensitivities[k];
        if (it->trouble == NULL && it->row_count > it->idle_count &&
            !add_ranking(layout, &figures, it)) {
            break;
        }
    }
    return figures;
}
