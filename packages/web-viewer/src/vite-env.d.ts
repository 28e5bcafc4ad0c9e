/** Version of the program, put in by the build. */
declare const __WAKELOOM_VERSION__: string;
declare module '*.css';
