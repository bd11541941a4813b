"""Users, tokens and the key of sessions, on both databases."""

from __future__ import annotations

from dataclasses import replace

import pytest

from ginnel.errors import StoreError
from ginnel.store import Store, users

ADA = users.User(name="ada", role=users.Role.EDIT, password_hash="$argon2id$one")
SCRIPT = users.Token(user="ada", label="script", digest="0" * 64, made_us=5)


def test_the_first_user_brings_the_key_and_the_next_ones_keep_it(store: Store) -> None:
    assert users.web_key(store) is None
    assert not users.has_users(store)
    users.put_user(store, ADA, new=True)
    key = users.web_key(store)
    assert key is not None
    assert len(key) == 32
    users.put_user(store, replace(ADA, name="bob", role=users.Role.LOOK), new=True)
    users.remove_user(store, "ada")
    assert users.web_key(store) == key
    assert [one.name for one in users.users(store)] == ["bob"]


def test_a_user_is_changed_but_never_added_by_mistake(store: Store) -> None:
    with pytest.raises(StoreError, match="there is no user ada"):
        users.put_user(store, ADA, new=False)
    users.put_user(store, ADA, new=True)
    with pytest.raises(StoreError, match="there is a user ada already"):
        users.put_user(store, ADA, new=True)
    changed = replace(ADA, password_hash="$argon2id$two")
    users.put_user(store, changed, new=False)
    assert users.user(store, "ada") == changed
    assert users.user(store, "eve") is None


def test_tokens_go_with_their_user(store: Store) -> None:
    with pytest.raises(StoreError, match="there is no user ada"):
        users.put_token(store, SCRIPT)
    users.put_user(store, ADA, new=True)
    users.put_token(store, SCRIPT)
    with pytest.raises(StoreError, match="has a token script already"):
        users.put_token(store, replace(SCRIPT, digest="1" * 64))
    assert users.user_of_token(store, SCRIPT.digest) == ADA
    assert users.user_of_token(store, "2" * 64) is None
    assert users.tokens(store, "ada") == [SCRIPT]
    users.remove_user(store, "ada")
    assert users.tokens(store) == []
    assert users.user_of_token(store, SCRIPT.digest) is None


def test_a_token_that_is_not_there_cannot_be_removed(store: Store) -> None:
    users.put_user(store, ADA, new=True)
    with pytest.raises(StoreError, match="ada has no token other"):
        users.remove_token(store, "ada", "other")
