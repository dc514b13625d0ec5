"""The little script of a page: it shows the numbers of a note, and moves from note to note.

A page says everything without it: the numbers come from the table of notes in the same page.
"""

from __future__ import annotations

import base64
import hashlib

SCRIPT = """
(() => {
  addEventListener('beforeprint', () => {
    document.querySelectorAll('.folded').forEach(part => { part.open = true; });
  });
  const staff = document.getElementById('staff');
  const shown = document.getElementById('shown');
  if (!staff || !shown) return;
  document.getElementById('keys').hidden = false;
  const notes = [...staff.querySelectorAll('.note')];
  const marked = notes.filter(note => note.dataset.off);
  const heads = [...document.querySelectorAll('#notes thead th')].map(head => head.textContent);
  let chosen = null;
  const show = note => {
    if (note === chosen) return;
    if (chosen) chosen.classList.remove('chosen');
    chosen = note;
    note.classList.add('chosen');
    const list = document.createElement('dl');
    [...document.getElementById('row-' + note.dataset.note).cells].forEach((cell, at) => {
      if (!cell.textContent) return;
      const pair = document.createElement('div'), name = document.createElement('dt');
      const value = document.createElement('dd');
      name.textContent = heads[at];
      value.textContent = cell.textContent;
      value.className = cell.className;
      pair.append(name, value);
      list.append(pair);
    });
    shown.className = 'filled';
    shown.replaceChildren(list);
  };
  const go = note => {
    if (!note) return;
    staff.querySelector('[tabindex="0"]').setAttribute('tabindex', '-1');
    note.setAttribute('tabindex', '0');
    note.focus();
  };
  const found = event => event.target.closest('.note');
  staff.addEventListener('focusin', event => { const note = found(event); if (note) show(note); });
  staff.addEventListener('pointerover', event => { const note = found(event); if (note) show(note); });
  staff.addEventListener('click', event => { const note = found(event); if (note) go(note); });
  staff.addEventListener('keydown', event => {
    const note = found(event);
    if (!note || event.ctrlKey || event.altKey || event.metaKey) return;
    const at = notes.indexOf(note), number = Number(note.dataset.note);
    const to = {
      ArrowRight: () => notes[at + 1],
      ArrowLeft: () => notes[at - 1],
      ArrowDown: () => marked.find(one => Number(one.dataset.note) > number),
      ArrowUp: () => marked.findLast(one => Number(one.dataset.note) < number),
      Home: () => notes[0],
      End: () => notes[notes.length - 1],
    }[event.key];
    if (!to) return;
    event.preventDefault();
    go(to());
  });
  document.addEventListener('click', event => {
    const link = event.target.closest('a[href^="#note-"]');
    if (!link) return;
    event.preventDefault();
    go(document.getElementById(link.hash.slice(1)));
  });
})();
"""
"""What runs in the page of one file."""

_HASH = base64.b64encode(hashlib.sha256(SCRIPT.encode()).digest()).decode()

POLICY = (
    f"default-src 'none'; style-src 'unsafe-inline'; script-src 'sha256-{_HASH}'; "
    "base-uri 'none'; form-action 'none'"
)
"""What a page may do: its own style, this very script, and nothing from anywhere else."""
