/**
 * Puts the editor and the token together. The token is kept in this tab (session storage) and sent as a header over
 * HTTP, in the first message over WebSocket; it is part of no query and of no URL.
 */
(() => {
  const KEPT = 'ringbinder.token';
  const { React, ReactDOM, GraphiQL, graphqlWs } = window;

  const EXAMPLES = [
    `# The chips of the lab,
# and what their release "current" points at.
query Chips {
  chips(first: 20) {
    edges {
      node {
        serial
        head {
          number
          model { referenceFrequencyThz fsrGhz }
        }
        release {
          sequence createdAt
          version {
            number stale
            configuration { name }
          }
        }
      }
    }
  }
}
`,
    `# Would this be taken? Nothing is stored.
# Give a chip's serial under Variables.
query Check($chip: String!) {
  checkSpecification(input: {
    chip: $chip
    specification: { family: {
      family: ELLIPTIC, shape: LOW_PASS, order: 4
      rippleDb: 2, rejectionDb: 40
      band: { offsetFsr: { low: -0.1, high: 0.1 } }
    } }
  }) {
    ok order rings designHash cached
    problem {
      code detail pointer
      nearest { reason input }
    }
  }
}
`,
    `# Asks for the design.
# Run it, then watch the request in the next tab.
mutation Ask($chip: String!) {
  requestDesign(input: {
    chip: $chip
    specification: { family: {
      family: ELLIPTIC, shape: LOW_PASS, order: 4
      rippleDb: 2, rejectionDb: 40
      band: { offsetFsr: { low: -0.1, high: 0.1 } }
    } }
  }) {
    request { id state cached }
  }
}
`,
    `# The state now, then every change,
# until it has ended.
subscription Watch($id: ID!) {
  designRequestChanged(id: $id) {
    state progress
    problem { code detail }
    design {
      id architecture order reason
      compliance { met worstMarginDb }
      setting {
        totalPowerMw
        cautions { code text }
        channels {
          channel drives currentMa limitMa
        }
      }
    }
  }
}
`,
    `# Designs with their figures,
# and a curve thinned out to about 200 points.
query Designs {
  designs(first: 5) {
    edges {
      node {
        id order architecture
        figures {
          insertionLossDb rippleDb
          rejectionDb bandwidth3DbGhz
          notDefined { figure reason }
        }
        response(reduceTo: 200) {
          offsetGhz transmissionDb groupDelayPs
        }
      }
    }
  }
}
`,
  ];

  const VARIABLES = [null, '{ "chip": "" }', '{ "chip": "" }', '{ "id": "" }', null];

  const root = ReactDOM.createRoot(document.getElementById('graphiql'));
  const field = document.getElementById('token');
  const viewer = document.getElementById('viewer');
  let token = window.sessionStorage.getItem(KEPT) ?? '';
  let client = null;

  const headers = () => (token === '' ? {} : { authorization: `Bearer ${token}` });

  function say(text, state) {
    viewer.textContent = text;
    viewer.dataset.state = state;
  }

  async function showViewer() {
    if (token === '') {
      say('Paste your token here. An administrator makes them.', 'none');
      return;
    }
    const response = await fetch('/graphql', {
      method: 'POST',
      headers: { 'content-type': 'application/json', ...headers() },
      body: JSON.stringify({ query: '{ me { role tokenExpiresAt actor { name } } }' }),
    });
    const { data, errors } = await response.json();
    if (data?.me) say(`${data.me.actor.name}, ${data.me.role}`, 'known');
    else say(errors?.[0]?.message ?? 'This token is not taken.', 'refused');
  }

  function render() {
    client?.dispose();
    const url = new URL('/graphql', window.location.href);
    url.protocol = url.protocol === 'https:' ? 'wss:' : 'ws:';
    client = graphqlWs.createClient({ url: url.href, lazy: true, connectionParams: headers });
    const fetcher = GraphiQL.createFetcher({ url: '/graphql', headers: headers(), wsClient: client });
    root.render(
      React.createElement(GraphiQL, {
        // Another token may see another schema: start anew.
        key: token,
        fetcher,
        // Without a token the schema is not shown: no use in asking for it.
        ...(token === '' ? { schema: null } : {}),
        storage: window.sessionStorage,
        shouldPersistHeaders: false,
        isHeadersEditorEnabled: false,
        defaultEditorToolsVisibility: 'variables',
        defaultTabs: EXAMPLES.map((query, i) => ({ query, variables: VARIABLES[i] })),
      }),
    );
    showViewer().catch((error) => say(String(error), 'refused'));
  }

  function use(next) {
    token = next.trim();
    if (token === '') window.sessionStorage.removeItem(KEPT);
    else window.sessionStorage.setItem(KEPT, token);
    field.value = token;
    render();
  }

  document.getElementById('access').addEventListener('submit', (event) => {
    event.preventDefault();
    use(field.value);
  });
  document.getElementById('forget').addEventListener('click', () => use(''));
  use(token);
})();
