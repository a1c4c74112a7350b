"""The report in a real browser: it fits a desk and a phone."""

import os
import re
import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest
from matplotlib.image import imread

pytestmark = pytest.mark.browser

FLAGS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--no-first-run",
)
# A phone is narrower than the least window of a desktop browser; a frame has the width it is given.
FRAME = """<!DOCTYPE html><html><body style="margin:0">
<iframe id="f" style="width:{width}px;height:{height}px;border:0"></iframe>
<script>
const frame = document.getElementById("f");
frame.addEventListener("load", () => {{
  const page = frame.contentDocument;
  if (!page.querySelector("main")) return;
  const inBox = (item) => item.closest(".scroll, nav ol, svg");
  const wide = [...page.querySelectorAll("main *, nav, header *")].filter(
    (item) => !inBox(item) && item.getBoundingClientRect().right > {width} + 1);
  const small = [...page.querySelectorAll("svg text")].filter(
    (item) => item.getBoundingClientRect().height < 8);
  const note = document.createElement("p");
  note.id = "measured";
  note.textContent = `scroll=${{page.documentElement.scrollWidth}} wide=${{wide.length}} ` +
    `small=${{small.length}} texts=${{page.querySelectorAll("svg text").length}}`;
  document.body.append(note);
}});
frame.srcdoc = {source};
</script></body></html>"""


@pytest.fixture(scope="module")
def browser() -> str:
    for name in ("chromium", "chromium-browser", "google-chrome"):
        found = shutil.which(name)
        if found:
            return found
    reason = "no chromium, chromium-browser or google-chrome on PATH"
    if os.environ.get("CI"):
        pytest.fail(reason)
    pytest.skip(reason)


def run(browser: str, profile: Path, *arguments: str) -> str:
    done = subprocess.run(
        [browser, *FLAGS, f"--user-data-dir={profile}", *arguments],
        check=True,
        capture_output=True,
        text=True,
        timeout=120,
    )
    return done.stdout


def measure(browser: str, folder: Path, html: str, width: int) -> dict[str, int]:
    import json

    # A script of ours measures the page from outside; the page's own policy stays in force.
    source = json.dumps(html).replace("</", "<\\/")
    frame = folder / "frame.html"
    frame.write_text(FRAME.format(width=width, height=900, source=source), encoding="utf-8")
    window = f"--window-size={max(width, 600)},1000"
    page = run(browser, folder / "profile", window, "--virtual-time-budget=8000", "--dump-dom",
               frame.as_uri())  # fmt: skip
    found = re.search(r'<p id="measured">([^<]*)</p>', page)
    assert found, "the measuring script left no result"
    return {key: int(value) for key, value in re.findall(r"(\w+)=(\d+)", found.group(1))}


@pytest.mark.parametrize("width", [390, 1280])
def test_nothing_is_wider_than_the_window(
    browser: str, html: str, width: int, tmp_path: Path
) -> None:
    found = measure(browser, tmp_path, html, width)
    assert found["scroll"] <= width
    assert found["wide"] == 0
    assert found["texts"] > 500
    assert found["small"] == 0


def test_measuring_sees_a_page_that_is_too_wide(browser: str, html: str, tmp_path: Path) -> None:
    broken = html.replace("</main>", '<p style="width:900px">x</p></main>')
    found = measure(browser, tmp_path, broken, 390)
    assert found["scroll"] > 390
    assert found["wide"] > 0


@pytest.mark.parametrize("width", [390, 1280])
def test_screenshot_shows_a_page(browser: str, html: str, width: int, tmp_path: Path) -> None:
    report, picture = tmp_path / "report.html", tmp_path / "shot.png"
    report.write_text(html, encoding="utf-8")
    run(browser, tmp_path / "profile", f"--window-size={width},1600", "--hide-scrollbars",
        f"--screenshot={picture}", report.as_uri())  # fmt: skip
    shot = imread(picture)
    assert shot.shape[0] == 1600
    dark = np.mean(shot[..., :3].mean(axis=2) < 0.5)
    assert 0.01 < dark < 0.4  # neither blank nor black
