// Elements of the page, as every part of the timeline makes them.

export function element(name, attributes = {}, ...children) {
  const made = document.createElement(name);
  for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
  made.append(...children);
  return made;
}

// Everything that takes the focus keeps JupyterLab's shortcuts away from itself.
export function focusable(name, attributes, ...children) {
  return element(name, { tabindex: "0", "data-lm-suppress-shortcuts": "true", ...attributes }, ...children);
}

export function button(words, title, act) {
  const made = focusable("button", { type: "button", "aria-label": title, title }, words);
  made.addEventListener("click", act);
  return made;
}

// The severity in its colour, its pattern and its word.
export function severityMark(severity) {
  return element("span", { class: "pa-mark" }, element("i", { class: `pa-swatch pa-${severity}` }), severity);
}

// A key that was meant for us: the page's own answer to it, and JupyterLab's, are left out.
export function taken(event) {
  event.preventDefault();
  event.stopPropagation();
}
