/* page.js: crosshair over the curves, and tables that sort. The page can be read without it. */
"use strict";

/* "97.13 nA": as the program writes it. */
function engineering(value, axis) {
    if (value === null || !isFinite(value)) {
        return "-";
    }
    if (!axis.prefix || value === 0) {
        return Number(value.toPrecision(5)) + (axis.unit ? " " + axis.unit : "");
    }
    const letters = ["f", "p", "n", "\u00b5", "m", "", "k", "M", "G", "T"];
    let power = Math.floor(Math.log10(Math.abs(value) * (1 + 1e-12)) / 3);
    power = Math.max(-5, Math.min(4, power));
    return (value / Math.pow(10, 3 * power)).toPrecision(5) + " " + letters[power + 5] + axis.unit;
}

/* Index of the computed point nearest to x. */
function nearest(xs, x) {
    let best = 0;
    for (let k = 1; k < xs.length; k++) {
        if (Math.abs(xs[k] - x) < Math.abs(xs[best] - x)) {
            best = k;
        }
    }
    return best;
}

function make(name, attributes, parent) {
    const node = document.createElementNS("http://www.w3.org/2000/svg", name);
    for (const key in attributes) {
        node.setAttribute(key, attributes[key]);
    }
    parent.appendChild(node);
    return node;
}

/* The crosshair stops at computed points only: what it reads out was solved, not interpolated. */
function prepare_plot(plot) {
    const svg = plot.querySelector("svg");
    const data = JSON.parse(plot.querySelector("script").textContent);
    const readout = plot.querySelector(".readout");
    const g = {};
    for (const key of ["left", "right", "top", "bottom", "xLow", "xHigh", "yLow", "yHigh", "yLinear"]) {
        g[key] = Number(svg.dataset[key]);
    }
    const height = svg.viewBox.baseVal.height;
    const line = make("line", { class: "f-cross", y1: g.top, y2: height - 50, visibility: "hidden" }, svg);
    const dots = data.series.map(() => make("circle", { class: "f-dot", r: 3, visibility: "hidden" }, svg));
    const place_x = (x) => g.left + (x - g.xLow) / (g.xHigh - g.xLow) * (g.right - g.left);
    const even = (y) => (g.yLinear > 0 ? Math.asinh(0.5 * y / g.yLinear) : y);
    const place_y = (y) => g.bottom + (even(y) - even(g.yLow)) / (even(g.yHigh) - even(g.yLow)) * (g.top - g.bottom);
    const guide = data.bars ? data.series[0]
        : data.series.reduce((a, b) => (b.x.length > a.x.length ? b : a));
    let at = nearest(guide.x, (g.xLow + g.xHigh) / 2);

    function show(x) {
        line.setAttribute("x1", place_x(x));
        line.setAttribute("x2", place_x(x));
        line.setAttribute("visibility", "visible");
        const parts = data.series.map((series, s) => {
            const k = nearest(series.x, x);
            const has = series.y[k] !== null;
            dots[s].setAttribute("visibility", has ? "visible" : "hidden");
            if (has) {
                dots[s].setAttribute("cx", place_x(series.x[k]));
                dots[s].setAttribute("cy", place_y(series.y[k]));
            }
            const name = data.series.length > 1 ? series.name + " " : "";
            const own = data.series.length > 1 && series.x[k] !== x
                ? " at " + engineering(series.x[k], data.x) : "";
            return name + engineering(series.y[k], data.y) + own;
        });
        readout.textContent = data.x.name + " " + engineering(x, data.x) + ": " + parts.join(", ");
        /* the same in full, for whoever wants to copy it */
        readout.dataset.points = JSON.stringify(data.series.map((series) => {
            const k = nearest(series.x, x);
            return [series.x[k], series.y[k]];
        }));
    }
    function show_index(k) {
        at = Math.max(0, Math.min(guide.x.length - 1, k));
        show(guide.x[at]);
    }
    svg.addEventListener("pointermove", (event) => {
        const box = svg.getBoundingClientRect();
        const px = (event.clientX - box.left) * svg.viewBox.baseVal.width / box.width;
        if (px >= g.left - 5 && px <= g.right + 5) {
            show_index(nearest(guide.x, g.xLow + (px - g.left) / (g.right - g.left) * (g.xHigh - g.xLow)));
        }
    });
    plot.addEventListener("keydown", (event) => {
        const pace = event.shiftKey ? 10 : 1;
        const moves = { ArrowLeft: at - pace, ArrowRight: at + pace, Home: 0, End: guide.x.length - 1 };
        if (event.key in moves) {
            event.preventDefault();
            show_index(moves[event.key]);
        }
    });
    plot.addEventListener("focus", () => show_index(at));
}

/* Numbers by value, empty cells last, everything else by its text. */
function sort_table(table, column, direction) {
    const body = table.tBodies[0];
    const key = (row) => {
        const cell = row.cells[column];
        return cell.dataset.value !== undefined ? Number(cell.dataset.value) : cell.textContent.trim();
    };
    const rows = Array.from(body.rows).sort((a, b) => {
        const x = key(a), y = key(b);
        if ((x === "") !== (y === "")) {
            return x === "" ? 1 : -1;
        }
        const order = typeof x === "number" && typeof y === "number" ? x - y
            : String(x).localeCompare(String(y), undefined, { numeric: true });
        return direction * order;
    });
    rows.forEach((row) => body.appendChild(row));
}

function prepare_table(table) {
    Array.from(table.tHead.rows[0].cells).forEach((head, column) => {
        const button = head.querySelector("button");
        if (!button) {
            return;
        }
        button.addEventListener("click", () => {
            const direction = head.getAttribute("aria-sort") === "ascending" ? -1 : 1;
            for (const other of table.tHead.rows[0].cells) {
                other.removeAttribute("aria-sort");
            }
            head.setAttribute("aria-sort", direction > 0 ? "ascending" : "descending");
            sort_table(table, column, direction);
        });
    });
}

document.querySelectorAll(".plot").forEach(prepare_plot);
document.querySelectorAll("table.sorts").forEach(prepare_table);
