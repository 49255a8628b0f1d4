// What the user tries on the path by hand.

export function trialPanel(ui) {
  const node = ui.element("div", { class: "pa-trial" });

  function show() {}

  return { node, show, marks: [] };
}
