document.querySelector('#pane')?.replaceChildren(`Counterpoise ${COUNTERPOISE_VERSION}`)
