"use strict";
// The page reads without this: it only lets a reader look at one configuration at a time, and print one bench sheet.
(() => {
  const sections = [...document.querySelectorAll("section.configuration")];
  const bar = document.getElementById("choose");
  const sheetOf = (section) => document.getElementById("sheet-" + section.dataset.letter);
  const button = (text, press) => {
    const made = document.createElement("button");
    made.type = "button";
    made.textContent = text;
    made.addEventListener("click", () => press(made));
    return made;
  };
  const show = (letter, pressed) => {
    for (const section of sections) {
      const hide = letter !== "" && section.dataset.letter !== letter;
      section.hidden = hide;
      const sheet = sheetOf(section);
      if (sheet) sheet.hidden = hide;
    }
    for (const other of bar.querySelectorAll("button")) {
      other.setAttribute("aria-pressed", String(other === pressed));
    }
  };
  if (sections.length > 1) {
    const word = document.createElement("span");
    word.textContent = "Show";
    const all = button("all", (made) => show("", made));
    all.setAttribute("aria-pressed", "true");
    bar.append(word, all);
    for (const section of sections) {
      const made = button(section.dataset.letter, (pressed) => show(section.dataset.letter, pressed));
      made.setAttribute("aria-pressed", "false");
      made.setAttribute("aria-label", "Show configuration " + section.dataset.letter);
      bar.append(made);
    }
    bar.hidden = false;
  }
  // A link to a configuration that is hidden shows it again.
  addEventListener("hashchange", () => {
    const target = document.getElementById(decodeURIComponent(location.hash.slice(1)));
    if (target && target.hidden) {
      bar.querySelector("button").click();
      target.scrollIntoView();
    }
  });
  for (const sheet of document.querySelectorAll("section.sheet")) {
    const made = button("Print this sheet", () => {
      document.body.dataset.print = "sheet";
      sheet.classList.add("printed");
      const after = () => {
        delete document.body.dataset.print;
        sheet.classList.remove("printed");
      };
      addEventListener("afterprint", after, { once: true });
      print();
    });
    made.className = "print";
    sheet.querySelector("header").append(made);
  }
})();
