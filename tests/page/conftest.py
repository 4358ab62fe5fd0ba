"""A real browser, and pages opened in it that may neither ask for anything nor complain."""

import os
import shutil

import pytest

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")


@pytest.fixture(scope="session")
def browser():
    if CHROMIUM is None and "CI" in os.environ:
        pytest.fail("no Chromium on this machine, which is to have one")
    if CHROMIUM is None:
        pytest.skip("no Chromium on this machine")
    sync_api = pytest.importorskip("playwright.sync_api")
    with sync_api.sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=["--no-sandbox"])
        yield browser
        browser.close()


@pytest.fixture
def open_file(browser):
    """Open a page by its path, and tell afterwards whether it asked for anything or complained."""
    told, asked, opened = [], [], []

    def open_page(path, **how):
        page = browser.new_page(**how)
        opened.append(page)
        page.on("console", lambda message: told.append(message.text))
        page.on("pageerror", lambda error: told.append(str(error)))
        page.on("request", lambda request: asked.append(request.url))
        page.goto(path.as_uri())
        return page

    yield open_page
    for page in opened:
        page.close()
    assert told == [], "the console stays empty"
    assert {url for url in asked if not url.startswith(("file:", "data:"))} == set()
    assert len([url for url in asked if url.startswith("file:")]) == len(opened), "each page is one file"
