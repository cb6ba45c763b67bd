// Takes, out of the scripts beside the page: a page opened from a file may read its neighbours no other way.
const Sounds = (() => {
  "use strict";
  const arrived = new Map();

  function script(name) {
    return new Promise((done, failed) => {
      const element = document.createElement("script");
      element.src = name;
      element.onload = () => { element.remove(); done(); };
      element.onerror = () => failed(new Error(`${name} is missing beside this page. Unpack the whole folder first, then open the page in it.`));
      document.head.append(element);
    });
  }

  function decode(text, recording) {
    const bytes = Uint8Array.from(atob(text), (c) => c.charCodeAt(0));
    // At the takes' own rate, so that nothing is resampled before the graph.
    return new OfflineAudioContext(recording.channels, 1, recording.rate).decodeAudioData(bytes.buffer);
  }

  return {
    arrive(number, takes) { arrived.set(number, takes); },
    // A map from letter to sound.
    async of(recording) {
      await script(recording.script);
      const takes = arrived.get(recording.number);
      arrived.delete(recording.number);
      const sounds = new Map();
      for (const letter of recording.letters) sounds.set(letter, await decode(takes[letter], recording));
      return sounds;
    },
  };
})();

function takesArrived(number, takes) { Sounds.arrive(number, takes); }
