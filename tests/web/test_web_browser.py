"""The page in a real browser: by keyboard, at two widths, light and dark, nothing from outside, no console errors."""

import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

pytest.importorskip("fastapi")
playwright = pytest.importorskip("playwright.sync_api")
CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")
pytestmark = [pytest.mark.slow, pytest.mark.skipif(CHROMIUM is None, reason="no Chromium")]

AXE = Path(__file__).parent / "vendor" / "axe.min.js"
PICTURES = os.environ.get("SHIFTPRED_SCREENSHOTS")
C13 = "166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3"


@pytest.fixture(scope="module")
def address():
    command = [sys.executable, "-m", "shiftpred", "serve", "--port", "0", "--no-browser", "--workers", "1"]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as server:
        yield server.stdout.readline().strip()
        server.terminate()


@pytest.fixture(scope="module")
def browser():
    with playwright.sync_playwright() as p:
        one = p.chromium.launch(executable_path=CHROMIUM, args=["--no-sandbox"])
        yield one
        one.close()


@pytest.fixture(params=[(1280, "light"), (390, "dark")], ids=["wide-light", "narrow-dark"])
def page(browser, address, request):
    width, scheme = request.param
    context = browser.new_context(
        viewport={"width": width, "height": 900},
        color_scheme=scheme,
        bypass_csp=False,
        accept_downloads=True,
        permissions=["clipboard-read", "clipboard-write"],
    )
    one = context.new_page()
    one.set_default_timeout(20_000)
    one.wrong, one.asked = [], []
    one.on("console", lambda m: one.wrong.append(m.text) if m.type in ("error", "warning") and "422" not in m.text else None)
    one.on("pageerror", lambda e: one.wrong.append(str(e)))
    one.on("request", lambda r: one.asked.append(r.url))
    one.goto(address)
    one.label = f"{width}-{scheme}"
    yield one
    assert one.wrong == []
    assert [u for u in one.asked if not u.startswith((address, "data:", "blob:"))] == []
    context.close()


def fill_in(page):
    page.fill("#structure", "CCOC(=O)c1ccccc1")
    page.fill("#c13", C13 + ", 29.9")
    page.fill("#h1", "8.04 (m, 2H), 7.55 (m, 1H), 7.43 (m, 2H), 4.38 (q, J = 7.1 Hz, 2H), 1.39 (t, J = 7.1 Hz, 3H)")
    page.wait_for_selector("#judgement .verdict")
    page.wait_for_function("document.querySelector('#assignment-tables').innerText.includes('4.38')")
    page.wait_for_function("document.querySelector('#busy').textContent === ''")


def shoot(page, name):
    if PICTURES:
        page.screenshot(path=f"{PICTURES}/{name}-{page.label}.png", full_page=True)


def test_answer_while_typing_linked_and_explained(page):
    fill_in(page)
    assert "supported" in page.inner_text("#judgement")
    assert "29.9" in page.inner_text("#leftovers")
    page.locator("#assignment-tables tbody tr").first.hover()
    assert page.locator("#structure-picture .site.lit").count() >= 1
    assert page.locator("#lane-pictures .bar.lit").count() >= 1
    page.locator("#assignment-tables button").first.focus()
    page.keyboard.press("Enter")
    page.wait_for_selector("#why-body svg")
    assert "Why this shift" in page.evaluate("document.activeElement.textContent")
    shoot(page, "answer")
    assert page.evaluate("document.documentElement.scrollWidth <= window.innerWidth")


def test_accessible(page):
    page.evaluate(AXE.read_text(encoding="utf-8"))
    fill_in(page)
    page.locator("#assignment-tables button").first.click()
    page.wait_for_selector("#why-body svg")
    page.locator("summary").first.click()
    found = page.evaluate("axe.run()")
    assert [(v["id"], [n["html"][:200] for n in v["nodes"]][:3]) for v in found["violations"]] == []


def test_what_was_not_understood_is_marked(page):
    page.fill("#c13", "166.6, abc, 60.9")
    page.wait_for_selector("#c13-said mark")
    assert "abc" in page.inner_text("#c13-said mark")
    assert page.get_attribute("#c13", "aria-invalid") == "true"
    page.fill("#c13", "166.6, 60.9")
    page.wait_for_selector("#c13-said:has-text('2 peaks understood')")


def test_input_survives_reload_link_and_steps(page, address):
    fill_in(page)
    page.reload()
    page.wait_for_selector("#judgement .verdict")
    page.click("#copy-link")
    page.wait_for_function("location.hash.startsWith('#i=')")
    link = page.url
    page.click("#clear")
    page.wait_for_selector("#judgement", state="hidden")
    page.click("#step-back")
    page.wait_for_selector("#judgement .verdict")
    assert page.input_value("#structure") == "CCOC(=O)c1ccccc1"
    page.click("#clear")
    page.evaluate("localStorage.clear()")
    page.goto("about:blank")
    page.goto(link)
    page.wait_for_selector("#judgement .verdict")
    assert "14.3" in page.input_value("#c13")


def test_files_to_keep(page, tmp_path):
    fill_in(page)
    for button, ending, content in (
        ("#save-html", ".html", "<!DOCTYPE html"),
        ("#save-json", ".json", '"schema_version"'),
        ("#save-csv", ".csv", "molecule,atom"),
        ("#save-structure", ".svg", "<svg"),
    ):
        with page.expect_download() as waited:
            page.click(button)
        assert waited.value.suggested_filename.endswith(ending)
        waited.value.save_as(tmp_path / "kept")
        assert content in (tmp_path / "kept").read_text(encoding="utf-8")


def test_picture_as_png(page, tmp_path):
    fill_in(page)
    with page.expect_download() as waited:
        page.click("#save-structure-png")
    waited.value.save_as(tmp_path / "kept.png")
    assert (tmp_path / "kept.png").read_bytes()[:8] == b"\x89PNG\r\n\x1a\n"


def test_by_keyboard_alone(page):
    page.locator("#clear").focus()
    page.keyboard.press("Tab")
    page.keyboard.type("CCO")
    for _ in range(3):
        page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.id") == "c13"
    page.keyboard.type("58.0, 18.2")
    page.wait_for_selector("#judgement .verdict")
    for _ in range(40):
        page.keyboard.press("Tab")
        if page.evaluate("document.activeElement.closest('#assignment-tables') !== null"):
            break
    page.wait_for_selector("#structure-picture .site.lit")
    page.keyboard.press("Enter")
    page.wait_for_selector("#why-body svg")


def test_very_long_paste_is_refused_in_words(page):
    page.evaluate(
        "() => { const box = document.querySelector('#c13'); box.value = '12.5, '.repeat(900000); "
        "box.dispatchEvent(new Event('input', {bubbles: true})); }"
    )
    page.wait_for_selector("#c13-said:has-text('at most 200,000')")


def test_dropped_file_is_read(page):
    page.evaluate(
        """() => { const t = new DataTransfer(); t.items.add(new File(["CCO ethanol"], "x.smi"));
        const drop = new DragEvent('drop', {dataTransfer: t, bubbles: true, cancelable: true});
        document.querySelector('#structure-card').dispatchEvent(drop); }"""
    )
    page.wait_for_selector("#structure-said:has-text('C2H6O')")


def test_names_are_shown_as_text(page):
    page.fill("#structure", "CCO <img src=x onerror=document.title='taken'>")
    page.fill("#c13", "58.0, 18.2, <img src=x onerror=document.title='taken'>")
    page.wait_for_selector("#c13-said .fault")
    page.wait_for_selector("#structure-picture svg")
    assert page.locator("main img").count() == 0
    assert page.title() != "taken"


def test_drawing_goes_both_ways(page):
    page.fill("#structure", "CCOC(=O)c1ccccc1")
    page.wait_for_selector("#structure-picture svg")
    page.click("#draw")
    page.wait_for_selector("#canvas canvas, #canvas :first-child")
    page.wait_for_timeout(500)
    shoot(page, "drawing")
    page.click("#take-drawing")
    page.wait_for_selector("#structure-said:has-text('C9H10O2')")
    assert re.search(r"M  END", page.input_value("#structure"))


def test_candidates_are_put_in_order(page):
    fill_in(page)
    page.click("summary:has-text('Put candidates in order')")
    page.fill("#candidates", "CCC(=O)Oc1ccccc1\nCCOC(=O)c1ccccc1")
    page.click("#rank")
    page.wait_for_selector("#ranking td")
    assert page.locator("#ranking tbody tr").first.inner_text().startswith("CCOC(=O)c1ccccc1")


def test_many_samples_run_filter_open(page, address):
    page.goto(address + "triage")
    rows = [
        "sample,smiles,c13,h1,solvent",
        f'right,CCOC(=O)c1ccccc1,"{C13}",,CDCl3',
        f'wrong,CCC(=O)Oc1ccccc1,"{C13}",,CDCl3',
        "=1+1,C1CC,20,,",
    ]
    page.fill("#table", "\n".join(rows))
    page.click("#run")
    page.wait_for_selector("#said:has-text('All 3 done')")
    lines = [line.inner_text() for line in page.locator("#rows tbody tr").all()]
    assert "supported" in lines[0] and "supported" not in lines[1] and "not judged" in lines[2]
    shoot(page, "triage")
    page.evaluate(AXE.read_text(encoding="utf-8"))
    assert [v["id"] for v in page.evaluate("axe.run()")["violations"]] == []
    page.select_option("#judgements", "supported")
    assert page.locator("#rows tbody tr").count() == 1
    with page.context.expect_page() as opened:
        page.click("#rows a")
    opened.value.wait_for_selector("#judgement .verdict")
    assert opened.value.input_value("#sample") == "right"


def test_table_that_is_too_long_is_refused_in_words(page, address):
    page.goto(address + "triage")
    page.fill("#table", "smiles,c13\n" + "CCO,58\n" * 3000)
    page.click("#run")
    page.wait_for_selector("#said:has-text('at most 2,000')")
    page.evaluate(
        "document.querySelector('#table').value = 'smiles,c13' + String.fromCharCode(10) + 'CCO,58\\n'.repeat(1000000)"
    )
    page.click("#run")
    page.wait_for_selector("#said:has-text('at most 3,000,000')")
