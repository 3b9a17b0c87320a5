"""The page of the report ``html``: facts from audits, drawings, template, style and script.

Needs the extra ``report``: a template engine and a plotting library, imported only in here.
"""
