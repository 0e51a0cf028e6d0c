#define DOCTEST_CONFIG_IMPLEMENT
#include <doctest/doctest.h>

#include <iostream>

// The main function of every test executable. One that ran no case has failed: a filter that matches nothing,
// or a source left out of the build, must not look like success. Listing cases or asking for help is no run.
namespace {

bool ran_no_case = false;

struct CaseCounter : doctest::IReporter {
  explicit CaseCounter(const doctest::ContextOptions& /*options*/) {}
  // Called at the end of a run, never of a query (--list-test-cases, --count, --help).
  void test_run_end(const doctest::TestRunStats& run) override {
    ran_no_case = run.numTestCasesPassingFilters == 0;
  }
  void report_query(const doctest::QueryData& /*query*/) override {}
  void test_run_start() override {}
  void test_case_start(const doctest::TestCaseData& /*test*/) override {}
  void test_case_reenter(const doctest::TestCaseData& /*test*/) override {}
  void test_case_end(const doctest::CurrentTestCaseStats& /*stats*/) override {}
  void test_case_exception(const doctest::TestCaseException& /*exception*/) override {}
  void subcase_start(const doctest::SubcaseSignature& /*subcase*/) override {}
  void subcase_end() override {}
  void log_assert(const doctest::AssertData& /*assertion*/) override {}
  void log_message(const doctest::MessageData& /*message*/) override {}
  void test_case_skipped(const doctest::TestCaseData& /*test*/) override {}
};

REGISTER_LISTENER("case_counter", 1, CaseCounter);

}  // namespace

int main(int argc, char** argv) {
  doctest::Context context(argc, argv);
  const int status = context.run();
  if (ran_no_case) {
    std::cerr << "no test case was run\n";
    return 1;
  }
  return status;
}
