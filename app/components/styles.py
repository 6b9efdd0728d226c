"""What every component's CSS starts from: shadow roots inherit variables, not rules."""

__all__ = ["SHARED"]

SHARED = """
:host {
  display: block; width: 100%; color: var(--ink) !important; font: 13px/18px var(--sans);
}
*, *::before, *::after { box-sizing: border-box; }
p { margin: 0; }
button, input, select, textarea { font: inherit; color: inherit; }
:is(button, input, a, textarea, select, summary):focus-visible {
  outline: 3px solid var(--accent); outline-offset: 2px;
  box-shadow: 0 0 0 2px var(--focus), 0 0 0 7px var(--focus);
}
.button {
  display: inline-flex; align-items: center; justify-content: center; gap: 8px; cursor: pointer;
  padding: 6px 11px; border: 1px solid var(--edge); border-radius: 6px;
  background: var(--surface); white-space: nowrap;
}
.button:hover { background: var(--sunken); }
.button:disabled { opacity: .45; cursor: default; }
.muted { color: var(--muted); }
"""
