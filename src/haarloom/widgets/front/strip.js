// The stations of the road as one strip: what each holds now, and which are open below.

export default {
  render({ model, el }) {
    const strip = document.createElement("div");
    strip.className = "haarloom hl-strip";
    strip.setAttribute("role", "group");
    strip.setAttribute("aria-label", "Stations of the model");
    el.append(strip);

    const toggle = (key) => {
      const open = model.get("opened");
      model.set("opened", open.includes(key) ? open.filter((k) => k !== key) : [...open, key]);
      model.save_changes();
    };
    const buttonFor = ({ key, thread }) => {
      const made = document.createElement("button");
      made.type = "button";
      made.dataset.station = key;
      made.dataset.lmSuppressShortcuts = "true";
      made.style.setProperty("--thread", thread);
      made.append(document.createElement("b"), document.createElement("span"));
      made.addEventListener("click", () => toggle(key));
      made.addEventListener("keydown", (event) => event.stopPropagation());
      return made;
    };
    const draw = () => {
      const stations = model.get("stations");
      // Buttons stay in place while their text changes, so that the focus is not lost.
      if (strip.children.length !== stations.length) strip.replaceChildren(...stations.map(buttonFor));
      stations.forEach(({ key, title, summary }, i) => {
        const button = strip.children[i];
        button.querySelector("b").textContent = title;
        button.querySelector("span").textContent = summary;
        button.setAttribute("aria-expanded", String(model.get("opened").includes(key)));
      });
    };
    model.on("change", draw);
    draw();
    return () => model.off("change", draw);
  },
};
