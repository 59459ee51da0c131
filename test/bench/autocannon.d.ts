/** As much of it as the benchmark uses; the package brings no types. */
declare module 'autocannon' {
  interface Options {
    url: string;
    connections: number;
    /** s */
    duration: number;
    method?: string;
    headers?: Readonly<Record<string, string>>;
    body?: string;
  }
  interface Result {
    /** s */
    duration: number;
    requests: { total: number };
    errors: number;
    timeouts: number;
    statusCodeStats: Readonly<Record<string, { count: number }>>;
  }
  export default function autocannon(options: Options): Promise<Result>;
}
