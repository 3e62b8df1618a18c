"""A reader at the page: clicks where numbers are, and sees what the page shows."""

from __future__ import annotations

import time

import numpy as np

PATIENCE = 60_000
"""Milliseconds: kernels may have to be compiled, and other tests run beside."""

FIND = """name => {
  const found = Bokeh.documents[0].get_model_by_name(name)
  return found.children === undefined ? found : found.children[0]
}"""


class Reader:
    def __init__(self, browser, url, width):
        self.page = browser.new_page()
        self.page.set_viewport_size({"width": width, "height": 900})
        self.page.set_default_timeout(PATIENCE)
        self.complaints = []
        self.page.on("console", lambda said: said.type in ("error", "warning") and self.complaints.append(said.text))
        self.page.on("pageerror", lambda error: self.complaints.append(str(error)))
        self.page.goto(url)
        self.wait_for(self.link)
        self.settle()

    def wait_for(self, condition):
        deadline = time.monotonic() + PATIENCE / 1000
        while not condition():
            assert time.monotonic() < deadline
            self.page.wait_for_timeout(50)

    def close(self):
        """Leave the page, which must not have complained."""
        assert self.text("notice") == ""
        self.page.close()
        assert self.complaints == []

    def settle(self):
        """Wait until the table's outline and the orbit are there."""
        self.wait_for(lambda: "..." not in self.text("orbit_title"))

    def text(self, name):
        """Words in one of the page's places."""
        return self.page.evaluate(f"name => ({FIND})(name).text", name)

    def facts(self, name):
        """Rows of a table of facts: values by the first words."""
        rows = self.page.locator(f".{ {'table': 'numbers', 'orbit': 'orbit'}[name] } tr")
        found = {}
        for row in rows.all():
            meaning, value = row.locator("th").inner_text(), row.locator("td").inner_text()
            found[meaning.splitlines()[0]] = value.replace("\N{MINUS SIGN}", "-")
        return found

    def title(self, plot):
        return self.page.evaluate(f"name => ({FIND})(name).title.text", plot).replace("\n", " ").strip()

    def points(self, plot, number, *columns):
        """Columns of the data behind one glyph of a plot."""
        found = self.page.evaluate(
            f"""([name, number, columns]) => {{
              const {{data}} = ({FIND})(name).renderers[number].data_source
              return columns.map(column => Array.from(data[column] ?? data.get(column)))
            }}""",
            [plot, number, list(columns)],
        )
        return [np.array(column, dtype=float) for column in found]

    def click(self, plot, x, y):
        """Click in a plot at a place in its own coordinates."""
        left, top = self.page.evaluate(
            f"""([name, x, y]) => {{
              const view = Bokeh.index.find_one(({FIND})(name))
              const box = view.el.getBoundingClientRect()
              const {{x_scale, y_scale}} = view.frame
              return [box.left + x_scale.compute(x), box.top + window.scrollY + y_scale.compute(y)]
            }}""",
            [plot, x, y],
        )
        self.page.evaluate("top => window.scrollTo(0, top - 300)", top)
        scrolled = self.page.evaluate("window.scrollY")
        self.page.mouse.click(left, top - scrolled)

    def link(self):
        return self.page.locator("#link").input_value()

    def download(self, selector, folder):
        with self.page.expect_download() as found:
            self.page.locator(selector).click()
        target = folder / found.value.suggested_filename
        found.value.save_as(target)
        return target
