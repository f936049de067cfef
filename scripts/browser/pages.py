"""Opens report pages in a real browser: no request, no error, choices work, numbers equal the JSON, hostile names stay text.

Usage: pages.py PROGRAM [--screenshots FOLDER]
"""

import argparse
import array
import json
import math
import pathlib
import random
import subprocess
import sys
import tempfile
import time
import wave

from playwright.sync_api import sync_playwright

ROOT = pathlib.Path(__file__).resolve().parents[2]
CHROMIUM = ("/usr/bin/chromium", "/usr/bin/chromium-browser", "/usr/bin/google-chrome")
HOSTILE = "<img src=x onerror=document.title='broken'>"
POINTS = 20_000
BYTES = 2_000_000
SOME_FAILED = 5

checks = 0
WITHOUT_CANDIDATES = ("spectrum", "coefficients", "overview", "archive", "hoist")
ARCHIVES = ("archive", "hoist")
LONG = 10_000_000


def check(condition, what):
    global checks
    checks += 1
    if not condition:
        sys.exit(f"pages.py: {what}")


def run(program, *arguments, code=0):
    done = subprocess.run([program, *map(str, arguments)], cwd=ROOT, capture_output=True, text=True)
    check(done.returncode == code, f"{' '.join(map(str, arguments))}: exit {done.returncode}: {done.stderr}")


def hostile_record(path):
    """Two seconds at 500 Hz, two channels; one name would run a script if the page took it for markup."""
    rows = [f't [s],"{HOSTILE}",=cmd [g]']
    for n in range(1000):
        t = n / 500
        rows.append(f"{t:.3f},{math.sin(40 * t) + 0.1 * math.sin(700 * t):.6f},{math.cos(55 * t) + 0.3 * t:.6f}")
    path.write_text("\n".join(rows) + "\n")


def batch(program, folder):
    """A batch of thirty cuts of one record, and a log that fails under a name that would run a script."""
    logs = folder / "logs"
    logs.mkdir()
    table = (ROOT / "fixtures" / "hoist.csv").read_text().splitlines()
    # Heading lines are those before the first number.
    first = next(number for number, line in enumerate(table) if line[:1].isdigit() or line[:1] == "-")
    rows = (len(table) - first) // 2
    for number in range(30):
        start = first + number * (len(table) - first - rows) // 30
        (logs / f"{number:02}.csv").write_text("\n".join(table[:first] + table[start : start + rows]) + "\n")
    (logs / HOSTILE.replace("/", "")).write_text("no record\n")
    done = subprocess.run(
        [program, "batch", "--lowpass", "3Hz", "--require", "within", "--tolerance", "2%", "--quiet", "--into", folder / "out", *sorted(logs.iterdir())],
        cwd=ROOT, capture_output=True, text=True,
    )
    check(done.returncode == SOME_FAILED, f"batch: exit {done.returncode}: {done.stderr}")
    return folder / "out"


def long_record(path):
    """LONG samples of 16 bits at 50 kHz: a tone that drifts, two knocks, and noise that repeats."""
    chance = random.Random(7)
    period = [8000 * math.sin(2 * math.pi * n / 100) + chance.gauss(0, 900) for n in range(100_000)]
    samples = array.array("h")
    for turn in range(LONG // len(period)):
        gain = 0.5 + 0.5 * math.sin(0.07 * turn)
        samples.extend(array.array("h", [int(gain * value) for value in period]))
    samples[3_333_333], samples[7_777_777] = 32_000, -32_000
    if sys.byteorder == "big":
        samples.byteswap()
    with wave.open(str(path), "wb") as file:
        file.setnchannels(1)
        file.setsampwidth(2)
        file.setframerate(50_000)
        file.writeframes(samples.tobytes())


def opened(browser, page_file, **options):
    """A page opened offline in a context of its own, with whatever it complained about."""
    context = browser.new_context(offline=True, **options)
    page = context.new_page()
    complaints, requests = [], []
    page.on("console", lambda message: complaints.append(message.text))
    page.on("pageerror", lambda error: complaints.append(str(error)))
    page.on("request", lambda request: requests.append(request.url))
    page.goto(page_file.as_uri())
    check(not complaints, f"{page_file.name}: console: {complaints}")
    check(requests == [page_file.as_uri()], f"{page_file.name}: requests: {requests}")
    return context, page


def count_points(page):
    return page.evaluate(
        """() => [...document.querySelectorAll('.field path')]
              .map(p => (p.getAttribute('d').match(/[ML]/g) || []).length).reduce((a, b) => a + b, 0)"""
    )


def check_layout(page, name):
    """Nothing wider than the window, no empty figure, no label outside its figure or over its neighbour."""
    width = page.evaluate("() => [document.documentElement.scrollWidth, window.innerWidth]")
    check(width[0] <= width[1], f"{name}: {width[0]} px wide in a window of {width[1]} px")
    faults = page.evaluate(
        """() => {
          const faults = [];
          for (const chart of document.querySelectorAll('.chart')) {
            const drawn = [...chart.querySelectorAll('.field path.line')].some(p => p.getAttribute('d').length > 8);
            if (!drawn) faults.push('empty: ' + chart.querySelector('figcaption').textContent);
            for (const side of ['.x-ticks', '.y-ticks']) {
              const ticks = [...chart.querySelectorAll(side + ' span')].map(s => s.getBoundingClientRect());
              if (ticks.length < 2) faults.push('fewer than two ticks: ' + chart.querySelector('figcaption').textContent);
              ticks.sort((a, b) => side === '.x-ticks' ? a.left - b.left : a.top - b.top);
              for (let i = 1; i < ticks.length; i++) {
                const over = side === '.x-ticks' ? ticks[i].left < ticks[i - 1].right : ticks[i].top < ticks[i - 1].bottom - 2;
                if (over) faults.push('labels overlap: ' + chart.querySelector('figcaption').textContent + side);
              }
            }
          }
          return faults;
        }"""
    )
    check(not faults, f"{name}: {faults}")


def check_choice(page, name):
    """Every option shows its own lines and hides the others, without any script."""
    chips = page.locator(".set > label")
    count = chips.count()
    check(count >= 8, f"{name}: {count} options")
    first_set = page.locator(".set:has(> label)").first
    labels = first_set.locator(":scope > label")
    for index in range(labels.count()):
        labels.nth(index).click()
        shown = first_set.evaluate(
            """s => [...s.querySelectorAll('.field path.line')].filter(p => getComputedStyle(p).display !== 'none')
                  .map(p => (p.getAttribute('class').match(/ o(\\d+)/) || [])[1]).filter(o => o !== undefined)"""
        )
        check(shown and set(shown) == {str(index)}, f"{name}: option {index} shows {set(shown)}")


def check_numbers(page, report, name):
    """The candidates' numbers on the page are those of the JSON, to the last bit."""
    for channel in report["channels"]:
        table = page.locator("section", has=page.locator("h2", has_text=channel["name"])).last
        rows = table.locator("table:has(caption:text('xtension')) tbody tr")
        check(rows.count() >= len(channel["candidates"]), f"{name}: {rows.count()} rows of candidates")
        for index, candidate in enumerate(channel["candidates"]):
            values = rows.nth(index).locator("data").evaluate_all("cells => cells.map(c => Number(c.value))")
            if candidate["predicted_error"] is None:
                continue
            wanted = [candidate["predicted_error"], 100 * candidate["relative_error"], candidate["bound"]]
            close = all(abs(a - b) <= 1e-12 * abs(b) for a, b in zip(values, wanted))
            check(len(values) >= 3 and close, f"{name}: {candidate['name']}: {values[:3]} on the page, {wanted} in the JSON")


def check_command(program, page, made, name):
    """The command line on the page gives the same page again."""
    page_file, _ = made
    line = page.locator("pre code").last.inner_text().replace("endgrain ", f"'{program}' ", 1)
    again = page_file.with_name(f"{name}-again.html")
    done = subprocess.run(["sh", "-c", f"{line} --html '{again}' --quiet --force"], cwd=ROOT, capture_output=True, text=True)
    check(done.returncode == 0, f"{name}: {line}: exit {done.returncode}: {done.stderr}")
    check(again.read_bytes() == page_file.read_bytes(), f"{name}: {line}: gave another page")


def check_archive(page, report, name):
    """The table of what is lost carries the JSON's numbers to the last bit, and the answer names the largest error."""
    for channel in report["channels"]:
        part = page.locator("section", has=page.locator("h2", has_text=channel["name"])).last
        cells = part.locator("table:has(caption:text('What is lost')) data").evaluate_all("cells => cells.map(c => Number(c.value))")
        keys = ("error", "max_error", "max_error_row", "max_error_at", "rmse", "psnr_db", "retained_energy", "error_correlation")
        wanted = [channel[key] for key in keys if channel[key] is not None]
        check(cells == wanted, f"{name}: {channel['name']}: {cells} on the page, {wanted} in the JSON")
        cells = part.locator("table:has(caption:text('How it is coded')) data").evaluate_all("cells => cells.map(c => Number(c.value))")
        keys = ("runner_up_bytes", "blocks", "bytes", "bits_per_sample", "ratio_to_doubles", "noise", "noise_bits", "kept", "cut_off")
        wanted = [channel[key] for key in keys if channel[key] is not None]
        check(cells == wanted, f"{name}: {channel['name']}: {cells} on the page, {wanted} in the JSON")
    error = next(figure for figure in report["figures"] if figure["y"]["name"].endswith("error"))
    largest = max(abs(point[1]) for point in error["lines"][0]["points"])
    wanted = report["channels"][0]["max_error"]
    check(largest == wanted, f"{name}: the figure's largest error is {largest}, that of the table {wanted}")


def check_readout(page, name):
    field = page.locator(".field").first
    field.focus()
    page.keyboard.press("ArrowRight")
    text = page.locator(".chart .readout").first.text_content()
    check(";" in text and len(text) > 10, f"{name}: the read-out says {text!r}")


def main():
    arguments = argparse.ArgumentParser()
    arguments.add_argument("program", type=lambda path: str(pathlib.Path(path).resolve()))
    arguments.add_argument("--screenshots", type=pathlib.Path)
    options = arguments.parse_args()
    chromium = next((path for path in CHROMIUM if pathlib.Path(path).exists()), None)
    if chromium is None:
        sys.exit("pages.py: no Chromium; type: sudo apt-get install chromium")
    with tempfile.TemporaryDirectory() as folder, sync_playwright() as play:
        folder = pathlib.Path(folder)
        record = folder / "hostile.csv"
        hostile_record(record)
        long = folder / "long.wav"
        long_record(long)
        made = {
            "compare": (folder / "compare.html", ["compare", "fixtures/hoist.csv", "--lowpass", "3Hz"]),
            "condition": (
                folder / "condition.html",
                ["condition", "fixtures/hoist.csv", "--lowpass", "12Hz", "-o", folder / "clean.csv"],
            ),
            "profile": (folder / "profile.html", ["compare", "fixtures/plank.csv", "--lowpass", "5mm"]),
            "spectrum": (folder / "spectrum.html", ["spectrum", "fixtures/hoist.csv", "--lowpass", "12Hz", "--octaves", "third"]),
            "coefficients": (
                folder / "coefficients.html",
                ["spectrum", "fixtures/plank.csv", "--method", "basis", "--extension", "even", "--against", "odd+line"],
            ),
            "velocity": (
                folder / "velocity.html",
                ["condition", "fixtures/hoist.csv", "--bandpass", "1Hz..12Hz", "--differentiate", "1", "-o", folder / "jerk.csv"],
            ),
            "travel": (
                folder / "travel.html",
                ["condition", "fixtures/hoist.csv", "--channel", "ax", "--integrate", "2", "--highpass", "1Hz", "--conditions", "steady",
                 "-o", folder / "travel.csv"],
            ),
            "overview": (folder / "overview.html", ["merge", batch(options.program, folder)]),
            "archive": (
                folder / "archive.html",
                ["compress", "fixtures/plank.csv", "--max-error", "0.5um", "-o", folder / "plank.grain"],
            ),
            "hoist": (
                folder / "hoist.html",
                ["compress", "fixtures/hoist.csv", "--rms-error", "0.5x", "-o", folder / "hoist.grain"],
            ),
            "long": (folder / "long.html", ["compare", long, "--lowpass", "2kHz"]),
            "hostile": (folder / "hostile.html", ["compare", record, "--lowpass", "20Hz"]),
        }
        for name, (page_file, command) in made.items():
            run(options.program, *command, "--html", page_file, "--quiet", code=SOME_FAILED if name == "overview" else 0)
            check(page_file.stat().st_size < BYTES, f"{page_file.name}: {page_file.stat().st_size} bytes")
        for name in ("compare", "archive"):
            again = folder / f"again-{name}.html"
            run(options.program, *made[name][1], "--html", again, "--quiet", *(["--force"] if name == "archive" else []))
            check(again.read_bytes() == made[name][0].read_bytes(), f"the same command gave another page of {name}")

        browser = play.chromium.launch(executable_path=chromium, args=["--no-sandbox", "--disable-dev-shm-usage"])
        for name, (page_file, _) in made.items():
            report = json.loads(pathlib.Path(f"{page_file}.json").read_text())
            for width in (1400, 400):
                start = time.monotonic()
                context, page = opened(browser, page_file, viewport={"width": width, "height": 900})
                if name == "long" and width == 1400:
                    # A benchmark, not a check: 2 s are aimed at.
                    print(f"the page of {LONG} samples opened in {time.monotonic() - start:.2f} s")
                check(count_points(page) <= POINTS, f"{name}: {count_points(page)} points")
                check(page.title() != "broken" and page.locator("img").count() == 0, f"{name}: a name became markup")
                check_layout(page, f"{name} at {width} px")
                if width == 1400:
                    check_readout(page, name)
                    # An overview has records for its input; a long one would take its time twice.
                    if name not in ("overview", "long"):
                        check_command(options.program, page, made[name], name)
                    if name in ARCHIVES:
                        check_archive(page, report, name)
                    if name not in WITHOUT_CANDIDATES:
                        check_choice(page, name)
                        if name != "hostile":
                            check_numbers(page, report, name)
                if options.screenshots:
                    page.screenshot(path=options.screenshots / f"{name}-{width}.png", full_page=True)
                context.close()
            context, page = opened(browser, page_file, java_script_enabled=False)
            if name not in WITHOUT_CANDIDATES:
                check_choice(page, f"{name} without scripts")
            check(page.locator(".answer p").first.inner_text().strip() != "", f"{name}: no answer without scripts")
            context.close()
            context, page = opened(browser, page_file, color_scheme="dark", viewport={"width": 1400, "height": 900})
            ground = page.evaluate("() => getComputedStyle(document.body).backgroundColor")
            check(sum(map(int, ground[4:-1].split(","))) < 200, f"{name}: dark ground is {ground}")
            if options.screenshots:
                page.screenshot(path=options.screenshots / f"{name}-dark.png", full_page=True)
            page.emulate_media(media="print", color_scheme="dark")
            ground = page.evaluate("() => getComputedStyle(document.body).backgroundColor")
            check(ground == "rgb(255, 255, 255)", f"{name}: paper is {ground}")
            pdf = page.pdf(format="A4", print_background=True)
            check(pdf.startswith(b"%PDF"), f"{name}: no print")
            if options.screenshots:
                (options.screenshots / f"{name}.pdf").write_bytes(pdf)
            context.close()
        hostile = json.loads((folder / "hostile.html.json").read_text())
        check(hostile["channels"][0]["name"] == HOSTILE, "the hostile name was not kept")
        lines = (folder / "hostile.html.csv").read_text().splitlines()
        check(not any(line.startswith(("=", "+", "-", "@")) for line in lines), "a formula in the CSV")
        browser.close()
    print(f"{checks} checks of report pages passed")


main()
