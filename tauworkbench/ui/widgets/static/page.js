// What the page itself must do for the bench: keep notebook shortcuts away from its controls, say
// which theme it has, and read the status aloud.
function render({ model, el }) {
  el.classList.add("tau-page-helper");
  const live = document.createElement("div");
  live.className = "tau-live";
  live.setAttribute("role", "status");
  live.setAttribute("aria-live", "polite");
  el.append(live);

  // A notebook's single-letter shortcuts act while a button or a menu has the focus ("d d" deletes a
  // cell). Its key handling looks for this attribute on the focused element itself.
  const mark = (event) => {
    if (event.target.closest && event.target.closest(".tau-bench")) {
      event.target.setAttribute("data-lm-suppress-shortcuts", "true");
    }
  };
  document.addEventListener("focusin", mark, true);

  const wanted = window.matchMedia("(prefers-color-scheme: dark)");
  const dark = () => {
    const light = document.body.dataset.jpThemeLight;
    return light === undefined ? wanted.matches : light === "false";
  };
  const tell = () => { model.send({ type: "dark", dark: dark() }); };
  const themes = new MutationObserver(tell);
  themes.observe(document.body, { attributes: true, attributeFilter: ["data-jp-theme-light"] });
  wanted.addEventListener("change", tell);
  tell();

  const say = () => { live.textContent = model.get("words"); };
  model.on("change:words", say);
  const explain = () => { // the help beside a field also belongs to its control
    for (const cell of document.querySelectorAll(".tau-bench .tau-field")) {
      const control = cell.querySelector("input, select"), help = cell.querySelector(".tau-help");
      if (!control || !help) { continue; }
      help.id = help.id || "tau-" + Math.random().toString(36).slice(2);
      control.setAttribute("aria-describedby", help.id);
      control.setAttribute("aria-invalid", String(Boolean(cell.querySelector(".tau-problem"))));
    }
  };
  document.addEventListener("focusin", explain, true);
  return () => {
    document.removeEventListener("focusin", mark, true);
    document.removeEventListener("focusin", explain, true);
    themes.disconnect();
    wanted.removeEventListener("change", tell);
    model.off("change:words", say);
  };
}
export default { render };
