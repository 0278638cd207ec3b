"""The page in a real browser: nothing wider than the screen, nothing cut off, no words on other words."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
from html import unescape
from pathlib import Path
from typing import Any

import pytest
from PIL import Image

BROWSER = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
pytestmark = pytest.mark.skipif(BROWSER is None, reason="no Chromium on the PATH: apt-get install chromium")

MEASURE = """
<script>
addEventListener("load", () => {
  const page = document.documentElement, pictures = [...document.querySelectorAll("svg")];
  const inside = (a, b) => a.left >= b.left - 1 && a.right <= b.right + 1
    && a.top >= b.top - 1 && a.bottom <= b.bottom + 1;
  const meet = (a, b) => Math.min(a.right, b.right) - Math.max(a.left, b.left) > -3
    && Math.min(a.bottom, b.bottom) - Math.max(a.top, b.top) > 2;
  const found = {width: page.clientWidth, scroll: page.scrollWidth, wide: [], cut: [], over: [], words: 0, small: 99};
  for (const each of document.querySelectorAll(".wide"))
    if (each.scrollWidth > each.clientWidth) found.wide.push(each.innerText.slice(0, 60));
  for (const each of pictures) {
    const texts = [...each.querySelectorAll("text")].map(t => [t.textContent, t.getBoundingClientRect()]);
    found.words += texts.length;
    texts.forEach(([said, box], k) => {
      if (!inside(box, each.getBoundingClientRect())) found.cut.push(said);
      found.small = Math.min(found.small, Math.max(box.height, 0));
      for (const [other, second] of texts.slice(k + 1)) if (meet(box, second)) found.over.push([said, other]);
    });
  }
  parent.postMessage(JSON.stringify(found), "*");
});
</script></body>"""
FRAME = """<!DOCTYPE html><title>frame</title><body style="margin:0"><pre id="found"></pre>
<script>addEventListener("message", event => {{ document.getElementById("found").textContent = event.data; }});</script>
<iframe src="measured.html" style="border:0;width:{width}px;height:900px"></iframe></body>"""


def browse(folder: Path, page: Path, *options: str) -> str:
    flags = ["--headless", "--no-sandbox", "--disable-gpu", "--hide-scrollbars"]
    command = [str(BROWSER), *flags, f"--user-data-dir={folder / 'profile'}", *options, page.as_uri()]
    return subprocess.run(command, capture_output=True, text=True, timeout=300, check=True, cwd=folder).stdout


def measured(file: Path, folder: Path, width: int, change: tuple[str, str] = ("", "")) -> dict[str, Any]:
    """The page at this width, its own rule against scripts lifted so that it can be measured."""
    text = re.sub(r"<meta http-equiv=[^>]*>", "", file.read_text(encoding="utf-8")).replace("</body>", MEASURE)
    (folder / "measured.html").write_text(text.replace(*change) if change[0] else text, encoding="utf-8")
    (folder / "frame.html").write_text(FRAME.format(width=width), encoding="utf-8")
    shown = browse(folder, folder / "frame.html", "--virtual-time-budget=20000", "--dump-dom")
    return dict(json.loads(unescape(re.findall(r'<pre id="found">(.*?)</pre>', shown, re.DOTALL)[0])))


@pytest.mark.parametrize("width", [360, 768, 1400])
def test_nothing_is_wider_than_the_screen_cut_off_or_written_over(file: Path, tmp_path: Path, width: int) -> None:
    seen = measured(file, tmp_path, width)
    assert seen["width"] == width
    assert seen["scroll"] <= width
    assert seen["words"] > 100, "the words of all pictures"
    assert seen["cut"] == []
    assert seen["over"] == []
    assert seen["wide"] == []
    assert seen["small"] > 8, "px: smaller letters cannot be read"


def test_a_page_that_is_not_so_would_be_seen(file: Path, tmp_path: Path) -> None:
    seen = measured(file, tmp_path, 360, ("<main>", '<main><p style="width:500px">too wide</p>'))
    assert seen["scroll"] > 360
    bad = '<text x="90" y="50">one</text><text x="92" y="52">two</text><text x="990" y="9">three</text></svg>'
    seen = measured(file, tmp_path, 768, ("</svg>", bad))
    assert ["one", "two"] in seen["over"]
    assert "three" in seen["cut"]


def paper(file: Path, folder: Path, *options: str) -> tuple[int, int, int]:
    """The colour of the page's corner."""
    picture = folder / "shot.png"
    browse(folder, file, f"--screenshot={picture}", "--window-size=800,600", *options)
    with Image.open(picture) as shot:
        red, green, blue = shot.convert("RGB").getpixel((3, 3))  # type: ignore[misc]
        assert len(shot.convert("RGB").getcolors(1 << 20) or ()) > 20, "something is drawn"
    return red, green, blue


def test_light_and_dark_by_the_readers_own_setting(file: Path, tmp_path: Path) -> None:
    assert min(paper(file, tmp_path)) > 240
    assert max(paper(file, tmp_path, "--blink-settings=preferredColorScheme=0")) < 50


def test_printed_it_is_dark_on_light_in_pages(file: Path, tmp_path: Path) -> None:
    target = tmp_path / "report.pdf"
    browse(tmp_path, file, f"--print-to-pdf={target}", "--blink-settings=preferredColorScheme=0")
    data = target.read_bytes()
    assert data.startswith(b"%PDF-")  # ISO 32000-1, 7.5.2
    pages = len(re.findall(rb"/Type\s*/Page\b(?!s)", data))
    assert 4 < pages < 20
