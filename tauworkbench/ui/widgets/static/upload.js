// A file of any size in pieces of 2 MiB, one under way at a time: the kernel's answer to each piece
// is what asks for the next. (One large message would close the connection without a word.)
const PIECE = 2 * 1024 * 1024;

function render({ model, el }) {
  el.classList.add("tau-upload");
  el.innerHTML = "";
  const label = document.createElement("label");
  label.textContent = model.get("label");
  const input = document.createElement("input");
  input.type = "file";
  input.accept = model.get("accept");
  input.className = "tau-file";
  input.setAttribute("data-lm-suppress-shortcuts", "true");
  const bar = document.createElement("progress");
  bar.max = 1;
  bar.value = 0;
  bar.hidden = true;
  bar.setAttribute("aria-label", "Upload");
  label.append(input);
  el.append(label, bar);

  let waiter = null;
  const heard = (message) => {
    if (message.type === "ack" && waiter) { const next = waiter; waiter = null; next(message.more); }
  };
  model.on("msg:custom", heard);
  const send = (message, buffers) => new Promise((resolve) => {
    waiter = resolve;
    model.send(message, undefined, buffers);
  });
  input.addEventListener("change", async () => {
    const file = input.files[0];
    if (!file) { return; }
    bar.hidden = false;
    bar.value = 0;
    let more = await send({ type: "start", name: file.name, size: file.size });
    for (let at = 0; more && at < file.size; at += PIECE) {
      more = await send({ type: "piece", at }, [await file.slice(at, at + PIECE).arrayBuffer()]);
      bar.value = Math.min(1, (at + PIECE) / file.size);
    }
    if (more) { await send({ type: "end" }); }
    bar.hidden = true;
    input.value = "";
  });
  return () => model.off("msg:custom", heard);
}
export default { render };
