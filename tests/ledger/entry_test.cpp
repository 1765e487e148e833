// Bodies and hashes of entries.
#include "ledger/entry.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <nlohmann/json.hpp>

#include "tests/ledger/made_entries.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

TEST(Entry, BodySaysEverythingOnOneLine) {
  EntryContent content = made_unit("0017", "fail");
  content.reason = "contact was dirty,\nsecond try";
  const auto body = body_of(content);
  ASSERT_TRUE(body) << body.error().finding;
  EXPECT_EQ(body->find('\n'), std::string::npos);
  const auto json = nlohmann::json::parse(*body);
  EXPECT_EQ(json["schema"], "coilassay.entry/1");
  EXPECT_EQ(json["kind"], "unit");
  EXPECT_EQ(json["time"], "2026-03-04T10:22:00Z");
  EXPECT_EQ(json["serial"], "0017");
  EXPECT_EQ(json["attempt"], 1);
  EXPECT_EQ(json["operator"], "Åsa");
  EXPECT_EQ(json["corrects"], nullptr);
  EXPECT_EQ(json["reason"], "contact was dirty,\nsecond try");
  EXPECT_EQ(json["sources"][1]["file"], "0017.sweep.csv");
  EXPECT_EQ(json["limits"][0]["value"], 4.7e-05);
}

TEST(Entry, ComesBackFromItsBodyAsItWas) {
  EntryContent content = made_unit("0017", "fail");
  content.reason = "another fixture";
  // Doubles that need all their digits, the smallest one, and a negative zero.
  content.details = R"({"x":[0.1,4.9406564584124654e-324,-0.0,1.7976931348623157e+308],"deep":{"b":[{"c":null}]}})";
  const auto body = body_of(content);
  ASSERT_TRUE(body);
  const auto back = content_of(*body);
  ASSERT_TRUE(back) << back.error().finding;
  EXPECT_EQ(body_of(*back).value(), *body);
  EXPECT_EQ(back->sources, content.sources);
  EXPECT_EQ(back->serial, "0017");
  EXPECT_EQ(back->reason, content.reason);
  const auto numbers = nlohmann::json::parse(back->details)["x"].get<std::vector<double>>();
  EXPECT_EQ(numbers, (std::vector<double>{0.1, 4.9406564584124654e-324, -0.0, 1.7976931348623157e+308}));
  EXPECT_TRUE(std::signbit(numbers[2]));
}

TEST(Entry, HashIsThatOfPreviousLineFeedAndBody) {
  // printf '%s\n%s' 000...0 '{"a":1}' | sha256sum
  EXPECT_EQ(entry_hash(kFirstPrevious, R"({"a":1})"), "f21735afd2cd6af4fc5804b0045cebfd545aef8396d29d030c39cb8880b45b7f");
}

TEST(Entry, DetailsMayNotContradictTheFields) {
  for (const char* name : {"verdict", "serial", "hash", "id", "schema"}) {
    EntryContent content = made_unit("0017", "fail");
    content.details = std::string(R"({")") + name + R"(":"pass"})";
    const auto body = body_of(content);
    ASSERT_FALSE(body) << name;
    EXPECT_THAT(body.error().finding, HasSubstr(name));
  }
}

TEST(Entry, WhatIsNoRecordIsRefused) {
  const auto refused = [](auto change) {
    EntryContent content = made_unit("0017");
    change(content);
    return !body_of(content).has_value();
  };
  EXPECT_TRUE(refused([](EntryContent& c) { c.serial = "\xff\xfe"; })) << "no UTF-8";
  EXPECT_TRUE(refused([](EntryContent& c) { c.lot = std::string("a\0b", 3); })) << "a zero byte";
  EXPECT_TRUE(refused([](EntryContent& c) { c.details = "[1]"; }));
  EXPECT_TRUE(refused([](EntryContent& c) { c.details = R"({"a":)"; }));
  EXPECT_TRUE(refused([](EntryContent& c) { c.details = R"({"a":NaN})"; }));
  EXPECT_TRUE(refused([](EntryContent& c) { c.attempt = 0; }));
  EXPECT_TRUE(refused([](EntryContent& c) { c.sources[0].sha256 = "abc"; }));
  EXPECT_TRUE(refused([](EntryContent& c) { c.corrects = 3; })) << "only a correction points back";
  EXPECT_TRUE(refused([](EntryContent& c) { c.kind = EntryKind::correction; c.corrects = 3; })) << "without a reason";
  EXPECT_FALSE(refused([](EntryContent& c) { c.kind = EntryKind::correction; c.corrects = 3; c.reason = "typed wrong"; }));
}

TEST(Entry, NestingWithoutEndIsNoRecord) {
  const std::string deep = std::string(100000, '[') + std::string(100000, ']');
  EXPECT_FALSE(content_of(R"({"schema":"coilassay.entry/1","x":)" + deep + "}"));
  EntryContent content = made_unit("0017");
  content.details = R"({"x":)" + deep + "}";
  EXPECT_FALSE(body_of(content));
  content.details = R"({"x":"[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[["})";  // brackets in a text are none
  EXPECT_TRUE(body_of(content));
}

TEST(Entry, AMemberOfAnotherTypeIsNoRecord) {
  const std::string body = body_of(made_unit("0017")).value();
  ASSERT_TRUE(content_of(body));
  for (const char* member : {"kind", "time", "serial", "attempt", "sources", "corrects", "schema"}) {
    auto json = nlohmann::json::parse(body);
    json[member] = true;
    EXPECT_FALSE(content_of(json.dump())) << member;
    json.erase(member);
    EXPECT_FALSE(content_of(json.dump())) << member;
  }
}

}  // namespace
}  // namespace coilassay::test
