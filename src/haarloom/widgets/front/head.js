// The top edge of a pane: title, a line of facts, and the code that rebuilds what is on screen.

function element(tag, className, text = "") {
  const node = document.createElement(tag);
  node.className = className;
  node.textContent = text;
  return node;
}

function button(label) {
  const node = element("button", "", label);
  node.type = "button";
  // Without this Lab would take Enter and the letters as its own shortcuts.
  node.dataset.lmSuppressShortcuts = "true";
  node.addEventListener("keydown", (event) => event.stopPropagation());
  return node;
}

function selectText(node) {
  const range = document.createRange();
  range.selectNodeContents(node);
  const selection = window.getSelection();
  selection.removeAllRanges();
  selection.addRange(range);
}

async function copy(text, shown) {
  try {
    await navigator.clipboard.writeText(text);
    return "Copied";
  } catch {
    // A page without a secure context has no clipboard: leave the text selected for the user's own keys.
    shown.hidden = false;
    selectText(shown.querySelector("pre"));
    return document.execCommand("copy") ? "Copied" : "Press Ctrl+C";
  }
}

// The sliders of the host have a label beside them but no name for a screen reader.
function nameSliders(pane) {
  for (const slider of pane.querySelectorAll(".widget-slider")) {
    const name = slider.querySelector(".widget-label")?.textContent ?? "";
    slider.querySelector('[role="slider"]')?.setAttribute("aria-label", name);
    const readout = slider.querySelector(".widget-readout");
    readout?.setAttribute("role", "textbox");
    readout?.setAttribute("aria-label", `value of ${name}`);
  }
}

function watchSliders(pane) {
  const watcher = new MutationObserver((changes) => {
    if (changes.some((change) => change.addedNodes.length && !change.target.closest("mjx-container, svg"))) nameSliders(pane);
  });
  watcher.observe(pane, { childList: true, subtree: true });
  nameSliders(pane);
  return () => watcher.disconnect();
}

export default {
  render({ model, el }) {
    const head = element("div", "haarloom hl-head");
    const selvedge = element("span", "hl-selvedge");
    const title = element("div", "hl-title");
    const name = element("h3", "");
    const status = element("span", "hl-status");
    status.setAttribute("role", "status");
    const buttons = element("div", "hl-buttons");
    const copyButton = button("Copy as Python");
    const showButton = button("Code");
    const shown = element("div", "hl-code");
    const text = element("pre", "");
    text.tabIndex = 0;
    text.dataset.lmSuppressShortcuts = "true";
    shown.hidden = true;
    shown.append(text);
    title.append(name, status);
    buttons.append(copyButton, showButton);
    head.append(selvedge, title, buttons, shown);
    el.append(head);

    const draw = () => {
      name.textContent = model.get("title");
      status.textContent = model.get("status");
      text.textContent = model.get("code");
      selvedge.style.background = model.get("selvedge");
      showButton.setAttribute("aria-expanded", String(!shown.hidden));
      copyButton.setAttribute("aria-label", `Copy ${model.get("title")} as Python`);
      showButton.setAttribute("aria-label", `Show the code of ${model.get("title")}`);
    };
    let timer = 0;
    const onCopy = async () => {
      copyButton.textContent = await copy(model.get("code"), shown);
      draw();
      clearTimeout(timer);
      timer = setTimeout(() => (copyButton.textContent = "Copy as Python"), 1600);
    };
    const onShow = () => {
      shown.hidden = !shown.hidden;
      draw();
    };
    copyButton.addEventListener("click", onCopy);
    showButton.addEventListener("click", onShow);
    model.on("change", draw);
    draw();
    // The head is put into its pane only after it has been rendered.
    let unwatch = () => {};
    const placed = requestAnimationFrame(() => {
      const pane = el.closest(".hl-pane");
      if (pane) unwatch = watchSliders(pane);
    });
    return () => {
      cancelAnimationFrame(placed);
      unwatch();
      clearTimeout(timer);
      model.off("change", draw);
    };
  },
};
