"""page_test.py PROGRAM SOURCE_DIR: the HTML page in headless Chromium, by the WebDriver protocol (W3C)
of ChromeDriver. Ends with 77 (skipped) where no Chromium is installed.

Checked: opens from a file without console messages and without fetching anything; the crosshair reads
the values that --json tells; columns sort; links reach their lines; keyboard alone is enough; names
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
    browser.command("Emulation.clearDeviceMetricsOverride")
    browser.command("Emulation.setEmulatedMedia", media="")
    pdf = base64.b64decode(browser.command("Page.printToPDF", preferCSSPageSize=True)["data"])
    check(pdf.startswith(b"%PDF") and len(pdf) > 10000, name + ": prints")


def check_page(browser, name):
    page, data, cell = make_page(name)
    browser.open(page)
    time.sleep(0.2)
    check(browser.messages() == [], name + ": console messages")
    check(browser.run("return performance.getEntriesByType('resource').length") == 0,
          name + ": something was fetched")
    check(data["title"] in browser.run("return document.querySelector('h1').textContent"), name + ": title")
    check_reading(browser, name, data)
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


browser = Browser()
try:
    check_live(browser)
    for name in ("widlar_mos_paper", "bias_tree", "bandgap"):
        check_page(browser, name)
finally:
    browser.close()
    shutil.rmtree(work, ignore_errors=True)
print("%d failures" % failures if failures else "the page holds in Chromium")
sys.exit(1 if failures else 0)
