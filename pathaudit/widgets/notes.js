// The notes pinned to the path.

export function notesPanel(ui) {
  const node = ui.element("div", { class: "pa-notes" });

  function show() {}

  function choose() {}

  return { node, show, choose };
}
