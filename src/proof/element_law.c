/*
 * element_law.c: the program of a `law` over a box of inputs. How an operation goes on where it has
 * no finite value stands in devices/law.h; there the range here is opened to the bounds that the
 * device itself keeps.
 */
#include "devices/law.h"
#include "devices/smooth.h"
#include "proof/element.h"
#include "proof/junction_range.h"

static const double largest = 1e100;
static const double least = 1e-60;

static struct interval bounded(struct interval a)
{
    a.lo = fmin(fmax(a.lo, -largest), largest);
    a.hi = fmax(fmin(a.hi, largest), -largest);
    return a;
}

static void bound_all(struct dual *e, int count)
{
    e->v = bounded(e->v);
    for (int k = 0; k < count; k++) {
        e->d[k] = bounded(e->d[k]);
    }
}

static const struct interval anything = {-1e100, 1e100};

static bool is_constant(const struct dual *e, int count)
{
    for (int k = 0; k < count; k++) {
        if (e->d[k].lo < 0 || e->d[k].hi > 0) {
            return false;
        }
    }
    return true;
}

static void take_log(struct dual *u, int count)
{
    if (u->v.lo >= least) {
        dual_chain(u, interval_log(u->v), interval_div(interval_point(1), u->v), u, count);
    } else {
        dual_chain(u, anything, (struct interval){0, 1 / least * 1.001}, u, count);
    }
}

static void take_exp(struct dual *u, int count)
{
    struct interval slope;
    const struct interval value = junction_expm1(u->v, &slope);
    const bool straight = u->v.hi > EXPONENT_LIMIT;
    dual_chain(u, straight ? interval_add(value, interval_point(1)) : interval_exp(u->v), slope, u,
               count);
}

static void take_sqrt(struct dual *u, int count)
{
    if (u->v.lo >= least) {
        const struct interval root = interval_sqrt(u->v);
        dual_chain(u, root, interval_div(interval_point(0.5), root), u, count);
    } else {
        struct interval root = interval_sqrt(u->v);
        root.hi = fmax(root.hi, 1.001e-30);
        dual_chain(u, root, (struct interval){0, 1.001 / (2 * sqrt(least))}, u, count);
    }
}

static void raise(struct dual *u, const struct dual *w, int count)
{
    const double e = w->v.lo;
    if (is_constant(w, count) && !(w->v.lo < w->v.hi) && fabs(e) <= 1000 && floor(e) >= e) {
        const int n = (int)e;
        const struct interval slope =
            n == 0 ? interval_point(0) : interval_scale(n, interval_power(u->v, n - 1));
        dual_chain(u, interval_power(u->v, n), slope, u, count);
        return;
    }
    if (!(u->v.lo >= least)) {
        dual_chain2(u, anything, anything, u, anything, w, count);
        return;
    }
    /* u^w = exp(w ln u) */
    const struct interval log_u = interval_log(u->v);
    const struct interval value = interval_exp(interval_mul(w->v, log_u));
    const struct interval by_u = interval_div(interval_mul(value, w->v), u->v);
    dual_chain2(u, value, by_u, u, interval_mul(value, log_u), w, count);
}

/* u itself below (least: true) or above w; where they cross both. */
static void choose(struct dual *u, const struct dual *w, bool least_one, int count)
{
    const struct dual *low = least_one ? u : w, *high = least_one ? w : u;
    /* min(u, w): u where u.hi <= w.lo; max(u, w): u where w.hi <= u.lo */
    if (low->v.hi <= high->v.lo) {
        return;
    }
    const struct interval *p = &u->v, *q = &w->v;
    const bool other = least_one ? q->hi <= p->lo : p->hi <= q->lo;
    if (other) {
        dual_chain(u, w->v, interval_point(1), w, count);
        return;
    }
    struct interval value;
    value.lo = least_one ? fmin(p->lo, q->lo) : fmax(p->lo, q->lo);
    value.hi = least_one ? fmin(p->hi, q->hi) : fmax(p->hi, q->hi);
    for (int k = 0; k < count; k++) {
        u->d[k] = interval_hull(u->d[k], w->d[k]);
    }
    u->v = value;
}

static void take_abs(struct dual *u, int count)
{
    const bool crosses = u->v.lo < 0 && u->v.hi > 0;
    const struct interval size = {crosses ? 0 : fmin(fabs(u->v.lo), fabs(u->v.hi)),
                                  interval_magnitude(u->v)};
    const struct interval slope = {u->v.lo < 0 ? -1 : 1, u->v.hi > 0 ? 1 : -1};
    dual_chain(u, size, slope.lo <= slope.hi ? slope : (struct interval){-1, 1}, u, count);
}

static void apply_one(enum law_operation operation, struct dual *u, int count)
{
    const struct interval ln10 = {2.302585092994045, 2.302585092994047};
    switch (operation) {
    case LAW_NEGATE:
        dual_chain(u, interval_neg(u->v), interval_point(-1), u, count);
        break;
    case LAW_SQRT:
        take_sqrt(u, count);
        break;
    case LAW_LN:
        take_log(u, count);
        break;
    case LAW_LOG10:
        take_log(u, count);
        dual_chain(u, interval_div(u->v, ln10), interval_div(interval_point(1), ln10), u, count);
        break;
    case LAW_EXP:
        take_exp(u, count);
        break;
    case LAW_ABS:
        take_abs(u, count);
        break;
    default:
        break;
    }
    bound_all(u, count);
}

static void apply_two(enum law_operation operation, struct dual *u, const struct dual *w, int count)
{
    const struct interval one = interval_point(1);
    switch (operation) {
    case LAW_ADD:
        dual_chain2(u, interval_add(u->v, w->v), one, u, one, w, count);
        break;
    case LAW_SUBTRACT:
        dual_chain2(u, interval_sub(u->v, w->v), one, u, interval_point(-1), w, count);
        break;
    case LAW_MULTIPLY: {
        const struct dual copy = *u;
        dual_product(u, &copy, w, count);
        break;
    }
    case LAW_DIVIDE: {
        const struct dual copy = *u;
        dual_quotient(u, &copy, w, count);
        break;
    }
    case LAW_POWER:
        raise(u, w, count);
        break;
    case LAW_MIN:
        choose(u, w, true, count);
        break;
    case LAW_MAX:
        choose(u, w, false, count);
        break;
    default:
        break;
    }
    bound_all(u, count);
}

static void law_range(const struct element *e, const struct interval *x, struct interval *value,
                      struct interval *slopes)
{
    const struct law_program *program = e->prepared;
    const int count = e->argument_count;
    struct dual stack[LAW_STACK_LIMIT];
    int depth = 0;
    dual_constant(&stack[0], interval_point(0), count);
    for (int k = 0; k < program->step_count; k++) {
        const struct law_step *step = &program->steps[k];
        switch (step->operation) {
        case LAW_CONSTANT:
            dual_constant(&stack[depth++], interval_point(step->value), count);
            break;
        case LAW_INPUT:
            dual_variable(&stack[depth++], x[step->index], step->index, count);
            break;
        case LAW_NEGATE:
        case LAW_SQRT:
        case LAW_LN:
        case LAW_LOG10:
        case LAW_EXP:
        case LAW_ABS:
            apply_one(step->operation, &stack[depth - 1], count);
            break;
        default:
            depth--;
            apply_two(step->operation, &stack[depth - 1], &stack[depth], count);
            break;
        }
    }
    *value = stack[0].v;
    for (int k = 0; k < count; k++) {
        slopes[k] = stack[0].d[k];
    }
}

const struct element_kind element_law = {"law", law_range, 0};
