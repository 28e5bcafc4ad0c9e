import type { RefObject } from 'preact';
import { useEffect, useRef, useState } from 'preact/hooks';

/** True while the page is shown dark. */
export function useDarkPage(): boolean {
  const [query] = useState(() => window.matchMedia('(prefers-color-scheme: dark)'));
  const [dark, setDark] = useState(query.matches);
  useEffect(() => {
    const changed = () => setDark(query.matches);
    query.addEventListener('change', changed);
    return () => query.removeEventListener('change', changed);
  }, [query]);
  return dark;
}

/** Reference to put on an element, and the width inside its padding, CSS px; 0 before it is known. */
export function useWidth<Kind extends HTMLElement>(): [RefObject<Kind | null>, number] {
  const ref = useRef<Kind>(null);
  const [width, setWidth] = useState(0);
  useEffect(() => {
    if (ref.current === null) return;
    const observer = new ResizeObserver(([entry]) => setWidth(Math.floor(entry.contentRect.width)));
    observer.observe(ref.current);
    return () => observer.disconnect();
  }, []);
  return [ref, width];
}
