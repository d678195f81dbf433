"""From programs and plans to C text. Nothing here derives anything; nothing here touches the disk."""
