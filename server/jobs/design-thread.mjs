// A thread does not inherit the loader that lets its parent read TypeScript: it registers its own.
import { register } from 'tsx/esm/api';

register();
export const { design, warm } = await import('./design-thread.ts');
