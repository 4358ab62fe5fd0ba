"""Text that goes into the page can only come out as text."""

from html.parser import HTMLParser

from hypothesis import given
from hypothesis import strategies as st

from flicker.markup import Markup, element, markup, pairs, table


class Reader(HTMLParser):
    def __init__(self):
        super().__init__(convert_charrefs=True)
        self.names, self.text, self.values = [], "", []

    def handle_starttag(self, tag, attrs):
        self.names.append(tag)
        self.values += [value for _, value in attrs]

    def handle_data(self, data):
        self.text += data


def read(html):
    reader = Reader()
    reader.feed(html)
    reader.close()
    return reader


printable = st.text(st.characters(codec="utf-8", exclude_categories=("Cc", "Cs")))


@given(text=printable, value=printable)
def test_any_text_survives_as_text_and_any_attribute_as_its_value(text, value):
    got = read(element("p", text, title=value))
    assert (got.names, got.text, got.values) == (["p"], text, [value])


def test_markup_is_taken_as_it_is_and_nothing_is_left_out_but_none():
    assert markup(element("b", "1 < 2"), None, 0, "&") == "<b>1 &lt; 2</b>0&amp;"
    assert isinstance(markup("<p>"), Markup)


def test_attributes_are_spelled_as_in_html():
    made = element("input", class_="a b", aria_label='"', disabled=True, checked=False, value=None)
    assert made == '<input class="a b" aria-label="&quot;" disabled>'


@given(cells=st.lists(st.lists(printable, min_size=2, max_size=2), min_size=1, max_size=4))
def test_tables_and_lists_hold_what_was_given(cells):
    got = read(table(("<a>", "b"), cells) + pairs(cells))
    assert got.text == "<a>b" + 2 * "".join(text for row in cells for text in row)
    assert set(got.names) == {"div", "table", "thead", "tbody", "tr", "th", "td", "dl", "dt", "dd"}
