import { useLayoutEffect, useRef, useState } from 'react'

/** The width of an element, followed as the pane is resized. */
export function useWidth<E extends HTMLElement>() {
  const element = useRef<E>(null)
  const [width, setWidth] = useState(0)
  useLayoutEffect(() => {
    const watched = element.current
    if (!watched) return
    const observer = new ResizeObserver(() => setWidth(watched.clientWidth))
    observer.observe(watched)
    return () => observer.disconnect()
  }, [])
  return { element, width }
}
