"""The wire between host and board: layouts, framing, rules of the conversation. Nothing here does I/O."""
