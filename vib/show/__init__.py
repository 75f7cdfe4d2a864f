"""What people look at: words, tables, pictures and the page.

Rooms: ``numbers`` (figures to text), ``blocks`` (a table or a sentence as plain data), ``words`` (verdicts
and the caution), ``tables`` (the nouns as blocks), ``documents`` (the nouns as JSON), ``files`` (CSV, npz,
writing), ``terminal`` (blocks to text), ``figures`` (pictures), ``page`` (the printable page).
"""
