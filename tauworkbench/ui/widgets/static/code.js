// Text to be read and copied.
function render({ model, el }) {
  el.classList.add("tau-code");
  el.innerHTML = "";
  const head = document.createElement("div");
  head.className = "tau-code-head";
  const title = document.createElement("span");
  title.textContent = model.get("title");
  const button = document.createElement("button");
  button.type = "button";
  button.className = "tau-small";
  button.textContent = "Copy";
  button.setAttribute("aria-label", "Copy: " + model.get("title"));
  button.setAttribute("data-lm-suppress-shortcuts", "true");
  const text = document.createElement("pre");
  text.tabIndex = 0;
  text.setAttribute("aria-label", model.get("title"));
  text.setAttribute("data-lm-suppress-shortcuts", "true");
  head.append(title, button);
  el.append(head, text);
  const show = () => { text.textContent = model.get("text"); };
  button.addEventListener("click", async () => {
    let done = true;
    try { await navigator.clipboard.writeText(model.get("text")); } catch {
      const range = document.createRange();
      range.selectNodeContents(text);
      const selection = window.getSelection();
      selection.removeAllRanges();
      selection.addRange(range);
      done = document.execCommand("copy");
    }
    button.textContent = done ? "Copied" : "Press Ctrl+C";
    setTimeout(() => { button.textContent = "Copy"; }, 1500);
  });
  model.on("change:text", show);
  show();
  return () => model.off("change:text", show);
}
export default { render };
