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

// A button that opens a box below itself, and the box. `fill` is called before it opens. Escape or a press elsewhere closes it; the focus
// goes back to where it was.
export function popover(words, title, inside, fill) {
  let back = null;
  const box = element("div", { class: "pa-box", role: "dialog", "aria-label": title, tabindex: "-1", "data-lm-suppress-shortcuts": "true" }, inside);
  const set = (on) => {
    box.hidden = !on;
    opener.setAttribute("aria-expanded", on);
  };
  const open = () => {
    back = document.activeElement;
    fill();
    set(true);
    (box.querySelector("input, button") || box).focus();
  };
  const shut = () => {
    set(false);
    (back || opener).focus();
  };
  const opener = button(words, title, () => (box.hidden ? open() : shut()));
  const node = element("span", { class: "pa-popover" }, opener, box);
  node.addEventListener("keydown", (event) => {
    if (event.key !== "Escape" || box.hidden) return;
    shut();
    taken(event);
  });
  node.addEventListener("focusout", (event) => node.contains(event.relatedTarget) || set(false));
  set(false);
  return { node, opener, box, open };
}

// Calls act on what an observer sees; gives what ends that. Whoever keeps the observer after its end (hosts do) keeps nothing of ours with it.
export function watching(Observer, target, options, act) {
  const held = { act }, observer = new Observer(() => held.act?.());
  observer.observe(target, options);
  return () => {
    observer.disconnect();
    held.act = null;
  };
}
