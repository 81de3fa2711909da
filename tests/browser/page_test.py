"""page_test.py PROGRAM SOURCE_DIR: the HTML page in headless Chromium, by the WebDriver protocol (W3C)
of ChromeDriver. Ends with 77 (skipped) where no Chromium is installed.

Checked: opens from a file without console messages and without fetching anything; the crosshair reads
the values that --json tells, of curves, loops and histograms; bars are as long as their values; columns sort; links reach their lines; keyboard alone is enough; names
and contrast (WCAG 2.1, 1.4.3) in light and dark; nothing is wider than the paper when printed."""
import base64
import json
import os
import shutil
import signal
import subprocess
import sys
import tempfile
import time
import urllib.error
import urllib.request

program, source = sys.argv[1], sys.argv[2]
chromium = shutil.which("chromium")
driver_path = shutil.which("chromedriver")
if not chromium or not driver_path:
    print("skipped: chromium and chromedriver (Debian: chromium, chromium-driver) are not installed")
    sys.exit(77)
work = tempfile.mkdtemp()
failures = 0


def check(is_right, what):
    global failures
    if not is_right:
        failures += 1
        print("FAILED:", what)


class Browser:
    def __init__(self):
        # port 0: the driver takes a free one and prints it
        self.driver = subprocess.Popen([driver_path, "--port=0"], stdout=subprocess.PIPE, text=True)
        port = None
        for line in self.driver.stdout:
            if "started successfully on port" in line:
                port = line.rsplit("port", 1)[1].strip(" .\n")
                break
        self.base = "http://127.0.0.1:%s" % port
        options = {"binary": chromium, "args": [
            "--headless", "--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage",
            "--window-size=1100,1400", "--user-data-dir=" + os.path.join(work, "profile")]}
        answer = self.ask("/session", {"capabilities": {"alwaysMatch": {
            "goog:chromeOptions": options, "goog:loggingPrefs": {"browser": "ALL"}}}})
        self.base += "/session/" + answer["sessionId"]

    def ask(self, path, body=None, method=None):
        data = None if body is None else json.dumps(body).encode()
        request = urllib.request.Request(self.base + path, data, {"Content-Type": "application/json"},
                                         method=method)
        with urllib.request.urlopen(request, timeout=60) as answer:
            return json.load(answer)["value"]

    def open(self, path):
        self.ask("/url", {"url": "file://" + path})

    def run(self, script, *arguments):
        return self.ask("/execute/sync", {"script": script, "args": list(arguments)})

    def command(self, name, **parameters):
        return self.ask("/goog/cdp/execute", {"cmd": name, "params": parameters})

    def keys(self, *keys):
        actions = [step for key in keys for step in (
            {"type": "keyDown", "value": key}, {"type": "keyUp", "value": key})]
        self.ask("/actions", {"actions": [{"type": "key", "id": "k", "actions": actions}]})

    def point(self, x, y):
        move = {"type": "pointerMove", "duration": 0, "x": round(x), "y": round(y)}
        self.ask("/actions", {"actions": [{"type": "pointer", "id": "p", "actions": [move]}]})

    def messages(self):
        return self.ask("/se/log", {"type": "browser"})

    def close(self):
        try:
            self.ask("", method="DELETE")
        except (OSError, urllib.error.URLError):
            pass
        self.driver.terminate()
        self.driver.wait()


TAB, HOME, END, RIGHT, ENTER = "\ue004", "\ue011", "\ue010", "\ue014", "\ue007"

CONTRAST = """
function rgb(text) { const m = text.match(/[0-9.]+/g).map(Number); return m; }
function light(c) {
    const f = (v) => (v /= 255) <= 0.03928 ? v / 12.92 : Math.pow((v + 0.055) / 1.055, 2.4);
    return 0.2126 * f(c[0]) + 0.7152 * f(c[1]) + 0.0722 * f(c[2]);
}
function ground(node) {
    for (; node; node = node.parentElement) {
        const c = rgb(getComputedStyle(node).backgroundColor);
        if (c.length < 4 || c[3] > 0) { return c; }
    }
    return [255, 255, 255];
}
const bad = [];
for (const node of document.querySelectorAll("body *")) {
    const own = Array.from(node.childNodes).some((n) => n.nodeType === 3 && n.textContent.trim());
    if (!own || node.tagName === "SCRIPT" || node.getClientRects().length === 0) { continue; }
    const style = getComputedStyle(node);
    const a = light(rgb(node instanceof SVGElement ? style.fill : style.color)), b = light(ground(node));
    const ratio = (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05);
    if (ratio < 4.5) { bad.push(node.tagName + " " + node.textContent.slice(0, 40) + " " + ratio); }
}
return bad;
"""

NAMES = """
const bad = [];
for (const node of document.querySelectorAll("table")) {
    if (!node.caption || !node.caption.textContent.trim()) { bad.push("a table without caption"); }
}
for (const node of document.querySelectorAll("button, a, [tabindex]")) {
    if (!(node.getAttribute("aria-label") || node.textContent).trim()) { bad.push(node.outerHTML); }
}
for (const node of document.querySelectorAll("svg.figure")) {
    if (node.getAttribute("role") !== "img" || !node.getAttribute("aria-label")) { bad.push("svg"); }
}
if (!document.documentElement.lang || !document.title || document.querySelectorAll("h1").length !== 1 ||
    !document.querySelector("main")) { bad.push("document"); }
const ids = Array.from(document.querySelectorAll("[id]")).map((n) => n.id);
if (new Set(ids).size !== ids.length) { bad.push("an id twice"); }
return bad;
"""


def make_page(name):
    cell = os.path.join(source, "netlists", name + ".cell")
    page = os.path.join(work, name + ".html")
    data = os.path.join(work, name + ".json")
    status = subprocess.run([program, cell, "--page", page, "--json=" + data],
                            stdout=subprocess.DEVNULL).returncode
    check(status in (0, 1), name + ": status %d" % status)
    with open(data, encoding="utf-8") as file:
        return page, json.load(file), cell


def check_reading(browser, name, data):
    """The crosshair against the curve in the JSON, by keys and by pointer."""
    curves = [o["curve"] for o in data["outputs"].values() if "curve" in o]
    guide = max(curves, key=lambda c: len(c["v"]))
    browser.run("document.querySelector('.plot').focus()")
    reading = "return JSON.parse(document.querySelector('.readout').dataset.points)"

    def nearest(x):
        return [min(zip(c["v"], c["current"]), key=lambda p: abs(p[0] - x)) for c in curves]

    def reads(k):
        return [tuple(p) for p in browser.run(reading)] == nearest(guide["v"][k])

    browser.keys(HOME)
    check(reads(0), name + ": first point")
    browser.keys(RIGHT, RIGHT)
    check(reads(2), name + ": third point")
    browser.keys(END)
    check(reads(-1), name + ": last point")
    place = browser.run("""
        const svg = document.querySelector('.plot svg'), box = svg.getBoundingClientRect();
        svg.scrollIntoView(); const now = svg.getBoundingClientRect();
        const k = now.width / svg.viewBox.baseVal.width, d = svg.dataset;
        return [now.left + k * (Number(d.left) + 0.6 * (d.right - d.left)),
                now.top + k * (Number(d.top) + 40), Number(d.xLow) + 0.6 * (d.xHigh - d.xLow)]""")
    browser.point(place[0], place[1])
    aimed = nearest(min(guide["v"], key=lambda v: abs(v - place[2])))
    check([tuple(p) for p in browser.run(reading)] == aimed, name + ": the pointer at %g reads %r" % (
        place[2], browser.run(reading)))


def ask(verb, cell):
    """What a verb tells as JSON."""
    data = os.path.join(work, verb + ".json")
    status = subprocess.run([program, verb, cell, "--json=" + data],
                            stdout=subprocess.DEVNULL).returncode
    check(status in (0, 1), "%s %s: status %d" % (verb, cell, status))
    with open(data, encoding="utf-8") as file:
        return json.load(file)


def is_near(a, b, relative=1e-12):
    return abs(a - b) <= relative * max(abs(a), abs(b))


def table_values(browser, caption):
    """[row][column] of the table whose caption begins so: its value to sort by, else its text."""
    return browser.run("""
        const table = Array.from(document.querySelectorAll('table'))
            .find((t) => t.caption.textContent.startsWith(arguments[0]));
        return table && Array.from(table.tBodies[0].rows).map((row) => Array.from(row.cells).map((cell) =>
            cell.dataset.value !== undefined ? Number(cell.dataset.value) : cell.textContent.trim()))""", caption)


def find_plot(browser, title):
    """Focuses the picture with this title; false when there is none."""
    return browser.run("""
        const plot = Array.from(document.querySelectorAll('.plot'))
            .find((p) => p.querySelector('.f-title').textContent.startsWith(arguments[0]));
        if (plot) { plot.focus(); }
        return Boolean(plot)""", title)


READING = "return JSON.parse(document.activeElement.querySelector('.readout').dataset.points)"


def check_reasons(browser, name, data):
    """Each share of each effect stands in the table with the bar it should have."""
    rows = table_values(browser, "Why:")
    widths = browser.run("""
        const table = Array.from(document.querySelectorAll('table'))
            .find((t) => t.caption.textContent.startsWith('Why:'));
        return Array.from(table.tBodies[0].rows).map((row) => {
            const bar = row.cells[4].querySelector('i'), all = bar.parentElement.getBoundingClientRect();
            const box = bar.getBoundingClientRect();
            return [(box.right - box.left) / all.width, (box.left + box.right) / 2 < all.left + all.width / 2]; })""")
    at = 0
    for hand in data["hand"]:
        shares = {s["effect"]: s["share"] for s in hand["shares"]}
        scale = max([abs(v) for v in shares.values()] + [abs(sum(shares.values()))])
        while at < len(rows) and rows[at][1] != "together":
            check(is_near(rows[at][2], shares.get(rows[at][1], 0.0)), name + ": share of " + rows[at][1])
            wanted = 0.5 * abs(rows[at][2]) / scale
            check(abs(widths[at][0] - wanted) < 0.01, name + ": bar of %s: %r" % (rows[at][1], widths[at]))
            check(wanted < 0.01 or widths[at][1] == (rows[at][2] < 0), name + ": side of " + rows[at][1])
            at += 1
        check(at < len(rows) and is_near(rows[at][2], sum(shares.values()), 1e-6), name + ": together")
        at += 1
    check(at == len(rows) and at > 1, name + ": %d rows of reasons" % len(rows))


def check_histograms(browser, name, data):
    """The bars are the counts: by the crosshair and by their heights on the screen."""
    for row in data.get("distributions", []):
        histogram = row["histogram"]
        counts, width = histogram["counts"], histogram["to"] - histogram["from"]
        if not find_plot(browser, row["quantity"] + " over mismatch"):
            check(len(counts) < 2, name + ": no histogram of " + row["quantity"])
            continue
        browser.keys(HOME)
        for k, count in enumerate(counts):
            read = browser.run(READING)[0]
            middle = histogram["from"] + width * (k + 0.5) / len(counts)
            check(read[1] == count and is_near(read[0], middle, 1e-9),
                  "%s: bar %d of %s reads %r instead of %r, %d" % (name, k, row["quantity"], read, middle, count))
            browser.keys(RIGHT)
        heights = browser.run("""
            const byplace = new Map();
            for (const bar of document.activeElement.querySelectorAll('.f-bar')) {
                const box = bar.getBoundingClientRect(); /* one cut at a limit has two parts of one height */
                byplace.set(Math.round(box.top * 10), box.height);
            }
            return Array.from(byplace.values()).sort((a, b) => a - b)""")
        unit = heights[-1] / max(counts)
        wanted = sorted(set(counts) - {0})
        check(len(heights) == len(wanted) and
              all(abs(h - unit * c) < 0.5 for h, c in zip(heights, wanted)),
              "%s: heights of %s: %r" % (name, row["quantity"], heights))


def check_spread(browser, name, cell):
    data = ask("spread", cell)
    check_histograms(browser, name, data)
    rows = table_values(browser, "What the variance") or []
    wanted = [c for c in data.get("contributors", []) if c["share"] >= 1e-3]
    check(len(rows) == len(wanted), name + ": %d causes instead of %d" % (len(rows), len(wanted)))
    for row, cause in zip(rows, wanted):
        check(row[:3] == [cause["quantity"], cause["device"], cause["cause"]] and
              is_near(row[3], cause["share"]) and is_near(row[4], cause["share"]) and
              is_near(row[5], cause["per_sigma"]), name + ": cause %r" % row)
    yields = table_values(browser, "Yield")
    check([y[1] for y in yields or []] == [y["share"] for y in data.get("yield", [])], name + ": yield")
    ranges = data["conditions"]["ranges"]
    for row in table_values(browser, "Least and most") or []:
        wanted = ranges[row[0]]
        check(is_near(row[2], wanted["least"]) and is_near(row[4], wanted["most"]), name + ": range %r" % row)
    if data["conditions"]["varied"] and data["contributors"]:
        check(find_plot(browser, data["contributors"][0]["quantity"] + " against "), name + ": no condition curve")


def check_states(browser, name, cell):
    data = ask("states", cell)
    rows = table_values(browser, "Every resting state")
    check(len(rows) == len(data["states"]), name + ": %d states" % len(rows))
    for row, state in zip(rows, data["states"]):
        check(row[1] == ("can be held" if state["can_hold"] else "cannot be held"), name + ": " + row[1])
        check(is_near(row[3], state["power"], 1e-6), name + ": power of %s" % row[0])
    curve = data.get("loop", {}).get("curve")
    if curve:
        check(find_plot(browser, "Loop at"), name + ": no loop curve")
        browser.keys(HOME, RIGHT)
        read = browser.run(READING)[0]
        check(is_near(read[0], curve["v"][1]) and is_near(read[1], curve["push"][1], 1e-6),
              name + ": the loop reads %r instead of %r" % (read, (curve["v"][1], curve["push"][1])))
        dot = browser.run("""
            const plot = document.activeElement, dot = plot.querySelector('.f-dot').getBoundingClientRect();
            const path = plot.querySelector('.f-curve'), from = path.getPointAtLength(0);
            const svg = plot.querySelector('svg').getBoundingClientRect();
            const scale = svg.width / 760, x = ((dot.left + dot.right) / 2 - svg.left) / scale;
            const y = ((dot.top + dot.bottom) / 2 - svg.top) / scale;
            const at = path.getAttribute('d').split(/[ML]/)[2].split(' ').map(Number);
            return Math.hypot(x - at[0], y - at[1])""")
        check(dot < 1.0, name + ": the dot lies %g px beside the loop curve" % dot)


def check_sorting(browser, name):
    """Each numeric column of each table sorts by value, up and down, by a click."""
    bad = browser.run("""
        const bad = [];
        for (const table of document.querySelectorAll('table.sorts')) {
            Array.from(table.tHead.rows[0].cells).forEach((head, c) => {
                const button = head.querySelector('button');
                if (!button || !head.classList.contains('n')) { return; }
                for (const direction of [1, -1]) {
                    button.click();
                    const values = Array.from(table.tBodies[0].rows)
                        .map((row) => row.cells[c].dataset.value).filter((v) => v !== undefined).map(Number);
                    for (let k = 1; k < values.length; k++) {
                        if (direction * (values[k] - values[k - 1]) < 0) { bad.push(head.textContent); }
                    }
                    if (head.getAttribute('aria-sort') !== (direction > 0 ? 'ascending' : 'descending')) {
                        bad.push('aria-sort of ' + head.textContent);
                    }
                }
            });
        }
        return bad""")
    check(bad == [], name + ": not sorted: %r" % bad)


def check_links(browser, name, data, cell):
    with open(cell, encoding="utf-8") as file:
        lines = file.read().split("\n")
    for row in data["requirements"]:
        shown = browser.run("""
            const link = Array.from(document.querySelectorAll('a[href^="#L"]'))
                .find((a) => a.getAttribute('href') === '#L' + arguments[0]);
            return link && document.querySelector(link.getAttribute('href')).textContent""", row["line"])
        check(shown == lines[row["line"] - 1], name + ": link to line %d" % row["line"])
    listing = browser.run("return Array.from(document.querySelectorAll('ol.cell li')).map((n) => n.textContent)")
    check(listing == (lines[:-1] if lines[-1] == "" else lines), name + ": the listing is the file")


def check_keyboard(browser, name):
    """From the top by the tab key alone: every control is reached; Enter sorts."""
    browser.run("document.activeElement.blur(); window.scrollTo(0, 0)")
    wanted = browser.run("return document.querySelectorAll('a, button, [tabindex=\"0\"]').length")
    reached = browser.run("""
        return Array.from(document.querySelectorAll('a, button, [tabindex="0"]'))
            .filter((n) => { n.focus(); return document.activeElement === n; }).length""")
    check(reached == wanted, name + ": %d of %d controls take the focus" % (reached, wanted))
    browser.run("document.querySelector('th button').focus()")
    browser.keys(ENTER)
    check(browser.run("return document.activeElement.parentElement.getAttribute('aria-sort')") is not None,
          name + ": Enter sorts")


def check_print(browser, name):
    """A4 within the margins of the page is 182 mm, 687 px: nothing is wider, no row is cut."""
    browser.command("Emulation.setEmulatedMedia", media="print")
    browser.command("Emulation.setDeviceMetricsOverride", width=687, height=1000, deviceScaleFactor=1,
                    mobile=False)
    wide = browser.run("""
        return Array.from(document.querySelectorAll('table, svg.figure, p, li'))
            .filter((n) => n.getBoundingClientRect().right > 688 || n.scrollWidth > n.clientWidth + 1)
            .map((n) => n.tagName + ' ' + n.textContent.slice(0, 30))""")
    check(wide == [], name + ": wider than the paper: %r" % wide)
    cut = browser.run("""
        return Array.from(document.querySelectorAll('tr, .plot'))
            .filter((n) => getComputedStyle(n).breakInside !== 'avoid').length""")
    check(cut == 0, name + ": %d rows may be cut" % cut)
    cut = browser.run("""
        return Array.from(document.querySelectorAll('.wide')).filter((n) =>
            n.querySelectorAll('tbody tr').length < 40 && getComputedStyle(n).breakInside !== 'avoid' ||
            getComputedStyle(n.querySelector('thead')).breakInside !== 'avoid').length""")
    check(cut == 0, name + ": %d tables may be cut" % cut)
    folded = browser.run("""
        return Array.from(document.querySelectorAll('td.n')).filter((n) => {
            const range = document.createRange();
            range.selectNodeContents(n);
            return n.textContent && new Set(Array.from(range.getClientRects()).map((r) => r.top)).size > 1;
        }).map((n) => n.textContent)""")
    check(folded == [], name + ": numbers on two lines: %r" % folded)
    browser.command("Emulation.clearDeviceMetricsOverride")
    browser.command("Emulation.setEmulatedMedia", media="")
    pdf = base64.b64decode(browser.command("Page.printToPDF", preferCSSPageSize=True)["data"])
    check(pdf.startswith(b"%PDF") and len(pdf) > 10000, name + ": prints")


def check_page(browser, name):
    page, data, cell = make_page(name)
    browser.open(page)
    time.sleep(0.2)
    found = browser.messages()
    check(found == [], name + ": console messages: %r" % found)
    check(browser.run("return performance.getEntriesByType('resource').length") == 0,
          name + ": something was fetched")
    check(data["title"] in browser.run("return document.querySelector('h1').textContent"), name + ": title")
    check_reading(browser, name, data)
    check_reasons(browser, name, data)
    check_spread(browser, name, cell)
    check_states(browser, name, cell)
    check_sorting(browser, name)
    check_links(browser, name, data, cell)
    check_keyboard(browser, name)
    bad = browser.run(NAMES)
    check(bad == [], name + ": without a name: %r" % bad)
    for scheme in ("light", "dark"):
        browser.command("Emulation.setEmulatedMedia",
                        features=[{"name": "prefers-color-scheme", "value": scheme}])
        bad = browser.run(CONTRAST)
        check(bad == [], name + ": contrast, %s: %r" % (scheme, bad[:5]))
    browser.command("Emulation.setEmulatedMedia", features=[])
    check_print(browser, name)
    check(browser.messages() == [], name + ": console messages at the end")


def check_verbs(browser):
    """The other verbs that have a page open without a message and show their own part."""
    cell = os.path.join(source, "netlists", "bandgap.cell")
    for verb, part in (("states", "states"), ("spread", "mismatch"), ("explain", "paper")):
        page = os.path.join(work, verb + ".html")
        status = subprocess.run([program, verb, cell, "--page", page], stdout=subprocess.DEVNULL).returncode
        check(status in (0, 1), verb + ": status %d" % status)
        browser.open(page)
        check(browser.messages() == [], verb + ": console messages")
        check(browser.run("return document.getElementById(arguments[0]) !== null", part), verb + ": no " + part)
        bad = browser.run(NAMES)
        check(bad == [], verb + ": without a name: %r" % bad)
        check_print(browser, verb)


def check_live(browser):
    """While the program watches, a save reaches the open page; the reader's place is kept."""
    cell, page = os.path.join(work, "live.cell"), os.path.join(work, "live.html")
    with open(os.path.join(source, "netlists", "widlar_mos.cell"), encoding="utf-8") as file:
        text = file.read()
    with open(cell, "w", encoding="utf-8") as file:
        file.write(text)
    watch = subprocess.Popen([program, cell, "--watch", "--page", page], stdout=subprocess.DEVNULL)
    try:
        for _ in range(600):
            if os.path.exists(page + ".live.js"):
                break
            time.sleep(0.1)
        browser.open(page)
        with open(cell, "w", encoding="utf-8") as file:
            file.write(text.replace('title   "', 'title   "saved again: '))
        for _ in range(600):
            if "saved again" in browser.run("return document.querySelector('h1').textContent"):
                break
            time.sleep(0.1)
        check("saved again" in browser.run("return document.querySelector('h1').textContent"),
              "the open page did not reload")
        bad = [m for m in browser.messages() if m["level"] == "SEVERE"]
        check(bad == [], "live: console messages: %r" % bad)
    finally:
        watch.send_signal(signal.SIGINT)
        watch.wait()
    browser.open(page)
    check(browser.run("return performance.getEntriesByType('resource').length") == 0,
          "the page after the watch fetches something")
    time.sleep(0.2)
    browser.messages()  # the page before may still have asked for news when the watch ended


browser = Browser()
try:
    check_live(browser)
    for name in ("widlar_mos_paper", "bias_tree", "bandgap", "beta_multiplier"):
        check_page(browser, name)
    check_verbs(browser)
finally:
    browser.close()
    shutil.rmtree(work, ignore_errors=True)
print("%d failures" % failures if failures else "the page holds in Chromium")
sys.exit(1 if failures else 0)
