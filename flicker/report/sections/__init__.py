"""Sections of the page, a module each; `flicker.report.page.section` registers them."""
