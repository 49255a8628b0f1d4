// What lies between a view and its kernel. Where no answer comes, or the kernel has ended, that is told in words; what is shown stays.

const GONE = "The kernel behind this timeline has ended. All that is shown can still be read; run the cell again to try changes.";
const SAVED = "Shown as it was saved, with no kernel behind it. Run the cell to try changes.";
const SILENT = "The kernel has not answered yet: it is busy, or its connection is lost. What is shown can still be read.";
const SILENCE = 4000;      // ms without a sign of life until that is told
const LIFE = ["change:block", "change:status", "change:trial", "change:notes"];

// ask(message, buffers) is null where nobody listens; it gives false where the kernel has ended. ended() is called when it does.
export function kernelLink(model, el, say, ended) {
  const saved = el.classList.contains("jupyter-widgets-disconnected");      // the mark of a widget that came with the notebook's file
  let gone = false, silent = false, timer = 0;

  function status() {
    return gone ? GONE : saved ? SAVED : model.get("status");
  }

  function heard() {
    clearTimeout(timer);
    if (silent) say(status());
    silent = false;
  }

  function end() {
    heard();
    gone = true;
    say(GONE);
    ended();
  }

  // A kernel that was shut down gives no notice: the first attempt to reach it fails.
  function reach(act) {
    try {
      if (!gone) act();
    } catch {
      end();
    }
    if (gone) {
      clearTimeout(timer);
      say(GONE);
    }
    return !gone;
  }

  function ask(message, buffers) {
    clearTimeout(timer);
    timer = setTimeout(() => { silent = true; say(SILENT); }, SILENCE);
    return reach(() => model.send(message, { iopub: { status: heard } }, buffers));
  }

  const heardOf = [["comm_live_update", end], ...LIFE.map((name) => [name, heard])];
  heardOf.forEach(([name, act]) => model.on(name, act));
  return {
    ask: model.send && !saved ? ask : null,
    status,
    set(name, value) {
      if (!saved && !gone) reach(() => { model.set(name, value); model.save_changes(); });
    },
    close() {
      clearTimeout(timer);
      heardOf.forEach(([name, act]) => model.off(name, act));
    },
  };
}
