"""The one stylesheet: less padding than Streamlit's, tablet-sized targets, and the paper's own details."""

import streamlit as st

SHEET = """
<style>
[data-testid="stMainBlockContainer"] { padding: 3.6rem 1.6rem 2rem 1.6rem; max-width: 1720px; }
[data-testid="stHeader"] { height: 3.2rem; }
[data-testid="stVerticalBlock"] { gap: 0.55rem; }
[data-testid="stHorizontalBlock"] { gap: 0.8rem; }
h1 { font-size: 1.35rem !important; padding: 0.1rem 0 !important; }
h2 { font-size: 1.15rem !important; padding: 0.1rem 0 !important; }
h3 { font-size: 1.0rem !important; padding: 0.1rem 0 !important; }
.stButton button, .stDownloadButton button, .stLinkButton a { min-height: 40px; }
[data-testid="stButtonGroup"] button { min-height: 40px; }
[data-testid="stWidgetLabel"] p { font-size: 0.86rem; }
[data-testid="stCaptionContainer"] p { font-size: 0.84rem; }
.st-key-lb-who { position: fixed; top: 0.5rem; right: 1rem; z-index: 1000000; width: auto !important; }
.st-key-lb-who button { border: none; background: transparent; min-height: 40px; }
.st-key-lb-runs-table > div, .st-key-lb-runs-table [data-testid="stFullScreenFrame"] { height: 100%; }
.st-key-lb-runs-table [data-testid="stElementToolbar"] { display: none; } /* it would lie over the buttons above */
.st-key-lb-message { position: fixed; top: 0.35rem; left: 24rem; right: 10.5rem; z-index: 1000000; width: auto !important;
  pointer-events: none; } /* in the bar: it moves nothing and covers nothing */
.st-key-lb-message [data-testid="stAlertContainer"] { padding: 0.45rem 0.6rem; min-height: 40px; }
[data-testid="stLayoutWrapper"]:has(> .st-key-lb-message) { position: absolute; }
.st-key-lb-message p { font-size: 0.86rem; line-height: 1.2; }
.stPageLink a { min-height: 40px; }
[class*="st-key-lb-dropzone"] [data-testid="stFileUploaderDropzoneInstructions"] { display: none; } /* the label says it */
/* what the browser holds back is said without hovering */
[class*="st-key-lb-dropzone"]:has([data-testid="stFileChip"][aria-invalid="true"])::after { font-size: 0.86rem;
  color: light-dark(#B5452C, #E58468); content: "This file is not read: a page takes at most 64 MB, the command line 256 MB (labbook reduce FILE --run CODE)."; }
.st-key-lb-last a p { text-decoration: underline; color: light-dark(#0B6E75, #4FB3B8); }
.lb-warned { border: 1px solid #E69F00; border-radius: 0.4rem; background: rgba(230,159,0,0.12); font-size: 0.88rem;
  line-height: 1.35; padding: 0.35rem 0.7rem; }
.lb-refused { color: light-dark(#B5452C, #E58468); font-size: 0.86rem; line-height: 1.25; margin: -0.2rem 0 0.1rem 0; }
.lb-note { font-size: 0.88rem; opacity: 0.8; line-height: 1.35; }
.lb-caution { font-size: 0.86rem; line-height: 1.4; border-left: 3px solid #E69F00; padding: 0.1rem 0 0.1rem 0.6rem; }
table.lb { border-collapse: collapse; font-size: 0.9rem; width: 100%; }
table.lb th { text-align: left; font-weight: 500; opacity: 0.75; padding: 0.28rem 0.6rem; white-space: nowrap; }
table.lb td { padding: 0.28rem 0.6rem; border-top: 1px solid rgba(128,128,128,0.25); vertical-align: top; }
table.lb td.n, table.lb th.n { text-align: right; font-variant-numeric: tabular-nums; white-space: nowrap; }
.lb-tag { display: inline-block; border: 1px solid rgba(128,128,128,0.45); border-radius: 0.7rem;
  padding: 0.05rem 0.55rem; margin: 0 0.3rem 0.2rem 0; font-size: 0.82rem; white-space: nowrap; }
@media (max-width: 1100px) { [data-testid="stMainBlockContainer"] { padding-left: 1rem; padding-right: 1rem; } }
</style>
"""


def apply() -> None:
    """Put the stylesheet on the page."""
    st.html(SHEET)
